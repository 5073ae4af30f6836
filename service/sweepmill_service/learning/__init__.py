"""What the store has measured, generalized to what was never sampled: costs and scatter of trajectories."""
