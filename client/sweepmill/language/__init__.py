"""The language of circuits written as data: layers of steps on places, with rates."""
