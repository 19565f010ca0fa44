"""Small systems: what is written out for a traverse against the loops, bit by bit, and the loops against NumPy."""

import itertools
import math

import numpy as np
import pytest

from vortexwidgets.fitting import elimination


def matrices(count):
    generator = np.random.default_rng(7)
    for _ in range(200):
        columns = generator.normal(size=(count + 1, 12)) * 10.0 ** generator.uniform(-6, 6, (count + 1, 1))
        yield (columns @ columns.T).tolist()


def test_elimination_by_hand_equals_the_loops(monkeypatch):
    short = [elimination.reduced(matrix, 1, None) for matrix in matrices(3)]
    monkeypatch.setattr(elimination, "_reduced_by_hand", lambda products: pytest.fail("not the loops"))
    for matrix, by_hand in zip(matrices(3), short, strict=True):
        matrix = [[value if k >= i else matrix[k][i] for k, value in enumerate(row)] for i, row in enumerate(matrix)]
        # A strength given is the loops' way; it is the one found, so nothing else may differ.
        assert elimination.reduced(matrix, 1, by_hand[0]) == by_hand


@pytest.mark.parametrize("bend", [None, [[0.3, -0.1], [-0.1, 0.2]]])
def test_solution_by_hand_equals_the_loops(monkeypatch, bend):
    systems = [[[*row[:2], row[2]] for row in matrix[:2]] for matrix in matrices(2)]
    short = [elimination.solved(system, bend) for system in systems]
    monkeypatch.setattr(elimination, "_solved_by_hand", lambda equations, bend: None)
    assert short == [elimination.solved(system, bend) for system in systems]


def test_inverse_by_hand_equals_the_loops(monkeypatch):
    short = [elimination.inverted(matrix, 3) for matrix in matrices(3)]
    monkeypatch.setattr(elimination, "_inverted_by_hand", lambda matrix: None)
    for by_hand, matrix in zip(short, matrices(3), strict=True):
        scale = np.sqrt(np.diag(matrix)[:3])
        loops = np.array(elimination.inverted(matrix, 3)) * scale * scale[:, None]
        assert np.array(by_hand) * scale * scale[:, None] == pytest.approx(loops, rel=1e-12, abs=1e-12)


def test_solution_is_numpys():
    for matrix in matrices(4):
        a, b = np.array(matrix)[:4, :4], np.array(matrix)[:4, 4]
        step, promise = elimination.solved([row[:5] for row in matrix[:4]])
        scale = np.sqrt(np.diag(a))
        expected = np.linalg.solve(a / scale / scale[:, None], b / scale) / scale
        assert step == pytest.approx(expected, rel=1e-6)
        assert promise == pytest.approx(float(b @ expected), rel=1e-6)
        inverse = np.array(elimination.inverted(matrix, 4)) * scale * scale[:, None]
        assert inverse == pytest.approx(np.linalg.inv(a / scale / scale[:, None]), rel=1e-6, abs=1e-6)


def test_a_row_that_depends_on_others_is_left_out():
    singular = [[2.0, 4.0, 6.0], [4.0, 8.0, 12.0]]
    assert elimination.solved(singular) == ([3.0, 0.0], 18.0)
    inverse = elimination.inverted(singular, 2)
    assert inverse == [[0.5, 0.0], [0.0, math.inf]]


@pytest.mark.parametrize("bend", [None, [[0.3, -0.1], [-0.1, 0.2]]])
def test_bend_by_hand_equals_the_loops(monkeypatch, bend):
    generator = np.random.default_rng(8)
    pairs = [([r[:] for r in a[:2]], [r[:] for r in b[:2]]) for a, b in itertools.pairwise(matrices(2))]
    given = [(bend, *pair, list(generator.uniform(0.5, 2, 2)), list(generator.normal(size=2))) for pair in pairs]
    short = [elimination.bent(*each) for each in given]

    class Two(list):
        """A step that does not say it has two entries, so that the loops take it."""

        def __len__(self):
            return 3

    for each, by_hand in zip(given, short, strict=True):
        loops = elimination.bent(each[0] or [[0.0] * 2] * 2, *each[1:4], Two(each[4]))
        assert by_hand == loops


def test_bend_finds_the_curvature_of_a_quadratic():
    """Of a quadratic whose first derivatives show only part of its matrix, the other part along two steps."""
    known, hidden = np.array([[2.0, 0.3, 0.1], [0.3, 1.5, 0.2], [0.1, 0.2, 1.0]]), np.diag([0.2, -0.1, 0.3])
    for size in (2, 3):
        whole = known[:size, :size] + hidden[:size, :size]
        here, bend = np.ones(size), None
        for step in np.eye(size) + 0.1:
            there = here + step
            before, now = (np.column_stack([known[:size, :size], -whole @ at]).tolist() for at in (here, there))
            bend = elimination.bent(bend, before, now, [1.0] * size, step.tolist())
            assert np.array(bend) @ step == pytest.approx(hidden[:size, :size] @ step, abs=1e-12)
            here = there
