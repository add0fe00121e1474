"""Programs written as .mps and .lp, read back by engines that are not ours."""

from __future__ import annotations

import re
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from designer.engines.export import export, safe_names
from designer.engines.model import quiet_highs
from designer.errors import InputError, UsageError
from designer.program.linear import LinearProgram
from designer.proof.prove import prove
from tests.engines.interim import interim_program
from tests.engines.programs import program

TRADE = interim_program([[10, 25, 40], [5, 30, 45]], [[1, 2, 1], [3, 1, 2]], 50)
MIXED = program(
    [[5, 4, 3], [2, 3, 1]], [None, 2], [16, 9], [0, None, 1], [5, 5, None], [7, 5, -3], "max",
    integer=[True, False, True], cost_den=3, col_den=7, cost_const=Fraction(5, 2),
)  # fmt: skip
# GLPK's readers know neither OBJSENSE nor a constant, which other readers do
PLAIN = replace(MIXED, col_den=1, sense="min", cost=-MIXED.cost, cost_const=Fraction(0))


def write(lp: LinearProgram, path: Path) -> None:
    rows = [f"lies[{i}, a b]" for i in range(lp.rows)]
    columns = [f"pays[{j}]" for j in range(lp.columns)]
    export(lp, rows, columns, path)


@pytest.mark.parametrize("ending", [".mps", ".lp"])
@pytest.mark.parametrize("lp", [TRADE, PLAIN], ids=["trade", "mixed"])
def test_glpk_reads_the_same_optimum(lp: LinearProgram, ending: str, tmp_path: Path) -> None:
    # GLPK 5.0 has readers of its own for both formats
    import swiglpk as glpk

    path = tmp_path / f"program{ending}"
    write(lp, path)
    glpk.glp_term_out(glpk.GLP_OFF)
    problem = glpk.glp_create_prob()
    if ending == ".mps":
        assert glpk.glp_read_mps(problem, glpk.GLP_MPS_FILE, None, str(path)) == 0
    else:
        assert glpk.glp_read_lp(problem, None, str(path)) == 0
    assert glpk.glp_get_num_cols(problem) == lp.columns
    names = {glpk.glp_get_col_name(problem, j + 1) for j in range(lp.columns)}
    assert names == set(safe_names([f"pays[{j}]" for j in range(lp.columns)], "c"))
    assert glpk.glp_simplex(problem, None) == 0
    assert glpk.glp_intopt(problem, None) == 0
    value = prove(lp).value
    assert value is not None
    assert glpk.glp_mip_obj_val(problem) == pytest.approx(float(value), rel=1e-9)
    glpk.glp_delete_prob(problem)


@pytest.mark.parametrize("ending", [".mps", ".lp", ".LP"])
def test_highs_reads_back_every_number(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"program{ending}"
    write(MIXED, path)
    model = quiet_highs()
    assert int(model.readModel(str(path.rename(tmp_path / f"again{ending.lower()}")))) != -1
    lp = model.getLp()
    assert list(lp.col_cost_) == [7 / 3, 5 / 3, -1.0]
    assert lp.offset_ == 2.5
    assert list(lp.col_lower_)[::2] == [0.0, 1 / 7]
    assert list(lp.col_upper_)[:2] == [5 / 7, 5 / 7]
    assert [value for value in lp.row_lower_ if value > -1e20] == [2.0]
    # the LP format writes a row with two sides as two rows
    assert sorted(value for value in lp.row_upper_ if value < 1e20) == [9.0, 16.0]
    assert [int(kind) for kind in lp.integrality_] == [1, 0, 1]
    assert int(lp.sense_) == -1


@given(st.lists(st.text(max_size=12), max_size=12))
def test_names_are_safe_and_unique(names: list[str]) -> None:
    safe = safe_names(names, "c")
    assert len(safe) == len(names)
    assert len({name.lower() for name in safe}) == len(safe)
    assert all(re.fullmatch(r"[A-Za-z_][A-Za-z0-9_.]*", name) for name in safe)


def test_names_that_mean_something_else_to_a_reader() -> None:
    assert safe_names(["e3", "inf", "Free", "st", "Obj", "end"], "c") == [
        "ce3", "cinf", "cFree", "cst", "cObj", "cend",
    ]  # fmt: skip
    assert safe_names(["a", "A", "a_2"], "c") == ["a", "A_2", "a_2_2"]


def test_another_ending_is_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError) as caught:
        write(TRADE, tmp_path / "program.txt")
    assert caught.value.mistakes[0].expected == "a file name ending in .mps or .lp"
    assert list(tmp_path.iterdir()) == []


def test_numbers_no_float_can_hold(tmp_path: Path) -> None:
    lp = program([[10**400]], [1], [None], [0], [None], [1])
    with pytest.raises(UsageError, match="numbers that a float can hold"):
        write(lp, tmp_path / "program.mps")


def test_a_place_that_cannot_be_written(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("not a folder")
    with pytest.raises(InputError):
        write(TRADE, tmp_path / "file" / "program.mps")
