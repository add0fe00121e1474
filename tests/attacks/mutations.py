"""Ways to spoil a JSON value: blind ones for any place, and ones that know the format."""

from __future__ import annotations

import json
import random
from collections.abc import Callable
from functools import partial
from typing import Any

JUNK: tuple[Any, ...] = (
    None,
    True,
    False,
    0,
    1,
    -1,
    2**31,
    2**63,
    -(2**64),
    10**30,
    1.0,
    0.5,
    float("nan"),
    float("inf"),
    "",
    "1",
    "-0x1",
    "0x10",
    "1/2",
    "0/1",
    "1/0",
    "0xg",
    "١",
    [],
    [0],
    [[[]]],
    {},
    {"den": 1, "idx": [], "num": []},
    {"den": 0, "idx": [0], "num": [1]},
    {"idx": [], "num": []},
    {"dual": {"den": 1, "idx": [], "num": []}},
)

Place = tuple[Any, Any]
"""(container, key or position)."""


def places(value: Any) -> list[Place]:
    """Every place inside a JSON value that can be overwritten."""
    found: list[Place] = []
    todo = [value]
    while todo:
        one = todo.pop()
        keys = one.keys() if isinstance(one, dict) else range(len(one))
        for key in keys:
            found.append((one, key))
            if isinstance(one[key], (dict, list)):
                todo.append(one[key])
    return found


def copied(value: Any) -> Any:
    return json.loads(json.dumps(value))


def blind(document: Any, dice: random.Random) -> None:
    """Spoil one place of the document, whatever it is."""
    container, key = dice.choice(places(document))
    old = container[key]
    ways: list[Callable[[], Any]] = [lambda: container.__setitem__(key, copied_junk(dice))]
    if type(old) is int:
        ways += 6 * [lambda: container.__setitem__(key, _other_number(old, dice))]
    if isinstance(old, str):
        ways += 3 * [lambda: container.__setitem__(key, _other_text(old, dice))]
    if isinstance(old, list):
        ways += 4 * [lambda: _shuffle(old, dice)]
    if isinstance(container, dict):
        ways += [lambda: container.pop(key), lambda: container.__setitem__("more", old)]
        ways += [lambda: container.__setitem__(dice.choice(list(container)), copied(old))]
    else:
        ways += [lambda: container.pop(key), lambda: container.insert(key, copied(old))]
    dice.choice(ways)()


def copied_junk(dice: random.Random) -> Any:
    junk = dice.choice(JUNK)
    return copied(junk) if isinstance(junk, (list, dict)) else junk


def _other_number(old: int, dice: random.Random) -> Any:
    return dice.choice(
        [old + 1, old - 1, -old, 2 * old, 0, old + 10**20, old * 10**400, hex(old), str(old)]
    )


def _other_text(old: str, dice: random.Random) -> Any:
    choices = [old + "0", "-" + old, old[:-1], old + "/2", old + "/1", old.upper(), " " + old]
    swaps = {"min": "max", "max": "min", "possible": "impossible", "impossible": "unbounded"}
    return dice.choice([*choices, *([swaps[old]] if old in swaps else [])])


def _shuffle(listed: list[Any], dice: random.Random) -> None:
    if not listed:
        listed.append(copied_junk(dice))
        return
    k, other = dice.randrange(len(listed)), dice.randrange(len(listed))
    way = dice.randrange(7)
    if way == 0:
        listed[k], listed[other] = listed[other], listed[k]
    elif way == 1:
        listed.reverse()
    elif way == 2:
        del listed[k:]
    elif way == 3:
        del listed[:k]
    elif way == 4:
        listed.append(copied(listed[k]))
    elif way == 5:
        listed[k] = copied(listed[other])
    else:
        listed.insert(0, copied_junk(dice))


def knowing(document: Any, dice: random.Random) -> None:
    """Spoil the program, its goals or a certificate while keeping the form of the document."""
    program, stage = document["program"], dice.choice(document["stages"])
    numbers = [program[name]["num"] for name in ("row_lo", "row_hi", "col_lo", "col_hi")]
    certificates = [part for part, key in places(document) if key == "den"]
    ways: list[Callable[[], Any]] = [
        lambda: _nudge(program["data"], dice),
        lambda: _nudge(dice.choice(numbers), dice),
        lambda: _drop_bound(program[dice.choice(["row_lo", "row_hi", "col_lo", "col_hi"])], dice),
        lambda: _add_bound(document, dice),
        lambda: _nudge(stage["cost"]["num"], dice),
        lambda: stage.__setitem__("sense", "min" if stage["sense"] == "max" else "max"),
        lambda: _stated(stage, dice),
        lambda: stage.pop(dice.choice([*(k for k in ("dual", "tree") if k in stage), "goal"])),
        lambda: _fewer_rows(document, dice),
        lambda: program.__setitem__("integer", list(range(program["columns"]))),
        lambda: program.__setitem__("integer", []),
        lambda: program.__setitem__("col_den", dice.choice([1, 2, 3, 5])),
        lambda: stage.__setitem__("rows", dice.randrange(program["rows"] + 1)),
        lambda: stage.__setitem__("columns", dice.randrange(program["columns"] + 1)),
        lambda: document["stages"].append(copied(stage)),
        lambda: document["stages"].remove(stage),
    ]
    for part in certificates:
        ways += 2 * [partial(_nudge, part["num"], dice)]
        ways += [partial(way, part, dice) for way in (_rescale, _drop_entry, _move_entry)]
    dice.choice(ways)()


def _nudge(numbers: list[Any], dice: random.Random) -> None:
    if numbers:
        k = dice.randrange(len(numbers))
        if type(numbers[k]) is int:
            numbers[k] += dice.choice([-2, -1, 1, 2, -2 * numbers[k], 10**12])


def _drop_bound(bounds: Any, dice: random.Random) -> None:
    if bounds["idx"]:
        k = dice.randrange(len(bounds["idx"]))
        del bounds["idx"][k], bounds["num"][k]


def _add_bound(document: Any, dice: random.Random) -> None:
    name = dice.choice(["row_lo", "row_hi", "col_lo", "col_hi"])
    size = document["program"]["rows" if name.startswith("row") else "columns"]
    bounds = document["program"][name]
    missing = [k for k in range(size) if k not in bounds["idx"]]
    if missing:
        k = dice.choice(missing)
        place = sum(1 for j in bounds["idx"] if type(j) is int and j < k)
        bounds["idx"].insert(place, k)
        bounds["num"].insert(place, dice.randint(-6, 6))


def _stated(stage: Any, dice: random.Random) -> None:
    stage["value"] = f"{dice.randint(-12, 12)}/{dice.randint(1, 4)}"


def _fewer_rows(document: Any, dice: random.Random) -> None:
    """Empty one row of the program: a demand that is no longer asked."""
    program = document["program"]
    if not program["rows"]:
        return
    i = dice.randrange(program["rows"])
    start, stop = program["indptr"][i], program["indptr"][i + 1]
    del program["indices"][start:stop], program["data"][start:stop]
    gone = stop - start
    program["indptr"] = [p - gone if k > i else p for k, p in enumerate(program["indptr"])]


def _rescale(vector: Any, dice: random.Random) -> None:
    """The same vector over another denominator, or (half of the time) a multiple of it."""
    factor = dice.choice([2, 3, 7])
    vector["num"] = [factor * n if type(n) is int else n for n in vector["num"]]
    if dice.random() < 0.5 and type(vector["den"]) is int:
        vector["den"] *= factor


def _drop_entry(vector: Any, dice: random.Random) -> None:
    if vector["idx"]:
        k = dice.randrange(len(vector["idx"]))
        del vector["idx"][k], vector["num"][k]


def _move_entry(vector: Any, dice: random.Random) -> None:
    if vector["idx"]:
        k = dice.randrange(len(vector["idx"]))
        if type(vector["idx"][k]) is int:
            vector["idx"][k] += dice.choice([-1, 1])
