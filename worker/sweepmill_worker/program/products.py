"""Pauli products on a state: measured, forced or dephased.

The rows that anticommute with a product form a column of their own, the sum of the columns that its letters select;
it is kept in the column behind those of the last site, and everything else is as for Z of a single site.
"""

from typing import NamedTuple

import numpy as np

from sweepmill_worker.clifford.moves import add_over_window, promote
from sweepmill_worker.clifford.state import (
    Lanes,
    State,
    address,
    aligned,
    column_chunk,
    erase,
    insert,
    new_state,
    rows_per_chunk,
)
from sweepmill_worker.clifford.vectors import any_bit, item, one_hot, splat, store, trailing_zeros
from sweepmill_worker.clifford.windows import smallest
from sweepmill_worker.jit import part, step
from sweepmill_worker.program.windows import extend_rows, set_window


class Product(NamedTuple):
    """A Pauli on up to four sites."""

    size: int
    sites: tuple[int, int, int, int]
    letters: int
    """Base-4 digits, the first site's most significant."""


def roomy_state(sites: int, mixed: bool) -> tuple[State, Lanes]:
    """A state with room for one more column behind the last."""
    state, lanes = new_state(sites, mixed)
    stride = state.stride + 2
    return state._replace(stride=stride, columns=aligned(state.chunks * stride * len(lanes), np.uint64)), lanes


@part
def letter(product: Product, ordinal: int) -> int:
    """0 I, 1 X, 2 Y, 3 Z."""
    return (product.letters >> (2 * (product.size - 1 - ordinal))) & 3


@part
def find_anticommuting(state: State, product: Product, lanes: Lanes) -> None:
    """Fill the last column: Z columns where the letter has an X part, X columns where it has a Z part."""
    for chunk in range(state.chunks):
        rows = splat(np.uint64(0), lanes)
        for ordinal in range(product.size):
            kind, site = letter(product, ordinal), product.sites[ordinal]
            if kind in (1, 2):
                rows = rows ^ column_chunk(state, chunk, 2 * site + 1, lanes)
            if kind >= 2:
                rows = rows ^ column_chunk(state, chunk, 2 * site, lanes)
        store(state.columns, address(state, chunk, 2 * state.sites, lanes), rows)


@step
def measure_product(state: State, product: Product, ring: bool, lanes: Lanes) -> bool:
    """Measure a product; was the outcome random?"""
    find_anticommuting(state, product, lanes)
    pivot = smallest(state, 2 * state.sites, state.stabilizers, state.start, state.end, lanes)
    logical = pivot < 0
    if logical:
        pivot = smallest(state, 2 * state.sites, state.logicals, state.start, state.end, lanes)
        if pivot < 0:
            return False
    multiply_pivot(state, pivot, ring, lanes)
    write_product(state, pivot, product, ring, lanes)
    if logical:
        promote(state, pivot, lanes)
    return True


@step
def dephase(state: State, product: Product, ring: bool, lanes: Lanes) -> None:
    """Measure a product and forget the outcome.

    If a stabilizer anticommutes, it leaves the group: it and the product become a pair of logical rows, and the
    other anticommuting rows are multiplied by it.  Otherwise the state commutes with the product and stays.
    """
    find_anticommuting(state, product, lanes)
    pivot = smallest(state, 2 * state.sites, state.stabilizers, state.start, state.end, lanes)
    if pivot < 0:
        return
    chunk = pivot // rows_per_chunk(lanes)
    rows = column_chunk(state, chunk, 2 * state.sites, lanes)
    only = one_hot(pivot - chunk * rows_per_chunk(lanes), lanes)
    store(state.columns, address(state, chunk, 2 * state.sites, lanes), rows ^ only)
    multiply_pivot(state, pivot, ring, lanes)
    slot = free_slot(state)
    write_product(state, slot, product, ring, lanes)
    erase(state.stabilizers, pivot)
    for row, other in ((pivot, slot), (slot, pivot)):
        insert(state.logicals, row)
        state.partner[row] = other


@part
def free_slot(state: State) -> int:
    """A row that is not in use; there is one, for 2 * stabilizers + logical rows = 2 * sites."""
    word = 0
    while state.stabilizers[word] | state.logicals[word] == np.uint64(0xFFFFFFFFFFFFFFFF):
        word += 1
    return int(64 * word + trailing_zeros(~(state.stabilizers[word] | state.logicals[word])))


@part
def multiply_pivot(state: State, pivot: int, ring: bool, lanes: Lanes) -> None:
    """Multiply the pivot into the rows of the last column; itself included if it is there, and then erased."""
    first, last = int(item(state.start, pivot)), int(item(state.end, pivot))
    home = pivot // rows_per_chunk(lanes)
    extend_rows(state, 2 * state.sites, first, last, ring, lanes)
    for turn in range(1, state.chunks + 1):  # the pivot's chunk last: there it may be erased
        chunk = (home + turn) % state.chunks
        rows = column_chunk(state, chunk, 2 * state.sites, lanes)
        if state.chunks == 1 or any_bit(rows):
            add_over_window(state, chunk, rows, first, last, pivot, lanes)


@part
def write_product(state: State, row: int, product: Product, ring: bool, lanes: Lanes) -> None:
    """Put the product in an empty row."""
    chunk = row // rows_per_chunk(lanes)
    bit = one_hot(row - chunk * rows_per_chunk(lanes), lanes)
    for ordinal in range(product.size):
        kind, site = letter(product, ordinal), product.sites[ordinal]
        if kind in (1, 2):
            old = column_chunk(state, chunk, 2 * site, lanes)
            store(state.columns, address(state, chunk, 2 * site, lanes), old ^ bit)
        if kind >= 2:
            old = column_chunk(state, chunk, 2 * site + 1, lanes)
            store(state.columns, address(state, chunk, 2 * site + 1, lanes), old ^ bit)
    first, last = span(product, state.sites, ring)
    set_window(state, row, first, last)


@part
def span(product: Product, sites: int, ring: bool) -> tuple[int, int]:
    """The shortest arc over the sites of a product; all from the lowest to the highest on a line."""
    best_first, best_length = 0, sites
    for candidate in range(product.size):
        first, length = product.sites[candidate], 0
        fits = True
        for ordinal in range(product.size):
            forward = product.sites[ordinal] - first
            fits &= ring or forward >= 0
            length = max(length, forward % sites)
        if fits and length < best_length:
            best_first, best_length = first, length
    return best_first, best_first + best_length
