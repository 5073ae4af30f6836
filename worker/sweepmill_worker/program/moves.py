"""One operation on the state."""

from sweepmill_worker.clifford.classes import Masks
from sweepmill_worker.clifford.moves import gate
from sweepmill_worker.clifford.state import Halves, Lanes, State, address
from sweepmill_worker.clifford.vectors import item, load, splat_half, store
from sweepmill_worker.jit import part
from sweepmill_worker.program.products import Product
from sweepmill_worker.program.windows import extend_over

X, Y, Z = 1, 2, 3


@part
def gate_on_pair(state: State, one: int, other: int, masks: Masks, chosen: int, ring: bool, lanes: Lanes) -> None:
    """A class of two-site gates on any two sites."""
    extend_over(state, one, other, ring, lanes)
    for chunk in range(state.chunks):
        gate(state, chunk, one, other, masks, chosen, lanes)


@part
def gate_on_site(state: State, site: int, masks: Halves, chosen: int, lanes: Lanes) -> None:
    """A class of one-site gates: a 2 x 2 map of the site's columns; windows stay."""
    for chunk in range(state.chunks):
        to_x = address(state, chunk, 2 * site, lanes)
        x, z = load(state.columns, to_x, lanes), load(state.columns, to_x + len(lanes), lanes)
        at = 4 * chosen
        new_x = (x & splat_half(item(masks, at), lanes)) ^ (z & splat_half(item(masks, at + 1), lanes))
        new_z = (x & splat_half(item(masks, at + 2), lanes)) ^ (z & splat_half(item(masks, at + 3), lanes))
        store(state.columns, to_x, new_x)
        store(state.columns, to_x + len(lanes), new_z)


@part
def turn(state: State, site: int, letter: int, lanes: Lanes) -> None:
    """Swap a letter with Z at a site, by a change of basis that undoes itself: X <-> Z or Y <-> Z."""
    for chunk in range(state.chunks):
        to_x = address(state, chunk, 2 * site, lanes)
        x, z = load(state.columns, to_x, lanes), load(state.columns, to_x + len(lanes), lanes)
        if letter == X:
            store(state.columns, to_x, z)
            store(state.columns, to_x + len(lanes), x)
        else:
            store(state.columns, to_x, x ^ z)


@part
def single(site: int, letter: int) -> Product:
    """A Pauli of one site."""
    return Product(1, (site, site, site, site), letter)
