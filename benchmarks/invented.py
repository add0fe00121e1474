"""Scenario files of any size, written out deterministically: invented parties, whole amounts.

Every function returns the files of one scenario by name; `scenario.toml` is the scenario
itself, and a joint prior goes into a sheet beside it, as an analyst would keep it.
"""

from __future__ import annotations

import itertools
import random
from collections.abc import Iterable, Mapping, Sequence

Files = dict[str, str]
Asked = Mapping[str, str | Sequence[str]]

PARTIES = ("Aldermoor", "Brackwell", "Corrie", "Dunmere", "Eskham", "Fallow", "Garth", "Hythe")


def named(party: int) -> str:
    """A party's name; numbered from the ninth on."""
    again, place = divmod(party, len(PARTIES))
    return f"{PARTIES[place]}{again + 1}" if again else PARTIES[place]


def ladder(party: int, size: int) -> list[int]:
    """Rising whole worths, uneven and different for each party: steps of 2 to 8."""
    return [5 * (a + 1) + (a * a + 2 * party) % 4 for a in range(size)]


def weights(party: int, size: int) -> list[int]:
    """Whole prior weights from 1 to 3, uneven and different for each party."""
    return [1 + (a * (party + 2) + party) % 3 for a in range(size)]


def odds(party: int, size: int) -> list[int]:
    """Whole prior weights from 1 to 999, drawn by a fixed seed."""
    draw = random.Random(party)  # noqa: S311 - a sample, not a secret
    return [draw.randrange(1, 1000) for _ in range(size)]


def joint_project(
    parties: int, types: int, asked: Asked, untied: bool = False, uneven: bool = False
) -> Files:
    """Build or leave; the outlay is about what the parties' middle types would bear.

    `untied`: half a crown more, so that no case leaves the choice open. `uneven`: as `odds`.
    """
    whole = parties * (5 * types) // 2
    outlay: int | str = f"{2 * whole + 1}/2" if untied else whole
    blocks = [
        _party(
            named(i),
            types=ladder(i, types),
            weights=odds(i, types) if uneven else weights(i, types),
            value={"build": "type", "leave": 0},
        )
        for i in range(parties)
    ]
    return _scenario("A joint project", ["build", "leave"], blocks, asked, outlay={"build": outlay})


def alike_project(parties: int, types: int, asked: Asked) -> Files:
    """Build or leave, among parties that are all alike; ties are frequent."""
    block = _party(
        "Farm",
        types=range(types),
        weights=weights(0, types),
        value={"build": "type", "leave": 0},
    )
    counted = block.replace('name = "Farm"', f'name = "Farm"\ncount = {parties}')
    outlay = parties * (types - 1) // 2
    return _scenario("A shared weir", ["build", "leave"], [counted], asked, {"build": outlay})


def trade(size: int, asked: Asked) -> Files:
    """One buyer and one seller, each with `size` types on overlapping grids."""
    buyer = _party(
        "Buyer",
        types=[3 * (a + 1) for a in range(size)],
        weights=weights(0, size),
        value={"sell": "type", "keep": 0},
    )
    seller = _party(
        "Seller",
        types=[3 * a + 1 for a in range(size)],
        weights=weights(1, size),
        value={"sell": 0, "keep": "type"},
        outside="type",
    )
    return _scenario("A sale", ["sell", "keep"], [buyer, seller], asked)


def one_item(bidders: int, types: int, asked: Asked) -> Files:
    """One item among bidders, or kept back."""
    names = [named(i) for i in range(bidders)]
    options = [*names, "nobody"]
    blocks = [
        _party(
            names[i],
            types=ladder(i, types),
            weights=weights(i, types),
            value={option: "type" if option == names[i] else 0 for option in options},
        )
        for i in range(bidders)
    ]
    return _scenario("One item", options, blocks, asked)


def correlated_item(bidders: int, types: int, asked: Asked) -> Files:
    """One item; parties whose positions are close to each other are likelier together."""
    files = one_item(bidders, types, asked)
    names = PARTIES[:bidders]
    labels = [ladder(i, types) for i in range(bidders)]
    lines = [",".join((*names, "weight"))]
    for profile in itertools.product(range(types), repeat=bidders):
        apart = max(profile) - min(profile)
        cells = [str(labels[i][a]) for i, a in enumerate(profile)]
        lines.append(",".join((*cells, str(1 + 3 * max(0, types - 2 * apart) + profile[0] % 2))))
    text = files["scenario.toml"]
    kept = [line for line in text.splitlines() if not line.startswith("weights")]
    first = kept.index("[decisions]")
    kept.insert(first, 'joint = "joint.csv"')
    return {"scenario.toml": "\n".join(kept) + "\n", "joint.csv": "\n".join(lines) + "\n"}


def general(parties: int, types: int, options: int, high: int, asked: Asked) -> Files:
    """Any worth below `high` for any option, drawn by a fixed seed; even odds."""
    draw = random.Random(5)  # noqa: S311 - a sample, not a secret
    names = [f"site{k + 1}" for k in range(options)]
    blocks = []
    for i in range(parties):
        kinds = []
        for a in range(types):
            worths = (f"w{k + 1} = {draw.randrange(high)}" for k in range(options))
            kinds.append(f'{{ name = "t{a}", {", ".join(worths)} }}')
        value = {name: f"w{k + 1}" for k, name in enumerate(names)}
        blocks.append(_party(named(i), types=kinds, weights=[1] * types, value=value))
    return _scenario("A choice of sites", names, blocks, asked)


def common_worth(types: int, asked: Asked) -> Files:
    """Two companies; a right is worth one's own soundings and half of the other's."""
    names = PARTIES[:2]
    blocks = []
    for i, name in enumerate(names):
        other = names[1 - i]
        worth = f"depth + types.{other}.depth / 2"
        kinds = [f'{{ name = "s{a}", depth = {d} }}' for a, d in enumerate(ladder(i, types))]
        blocks.append(
            _party(
                name,
                types=kinds,
                weights=weights(i, types),
                value={n: worth if n == name else 0 for n in names},
            )
        )
    return _scenario("Two surveys", names, blocks, asked)


def _party(
    name: str,
    *,
    types: Iterable[int | str],
    weights: Iterable[int],
    value: Mapping[str, int | str],
    outside: str | None = None,
) -> str:
    pairs = (f'{k} = "{v}"' if isinstance(v, str) else f"{k} = {v}" for k, v in value.items())
    lines = [
        "[[party]]",
        f'name = "{name}"',
        f"types = [{', '.join(map(str, types))}]",
        f"weights = [{', '.join(map(str, weights))}]",
        f"value = {{ {', '.join(pairs)} }}",
    ]
    if outside is not None:
        lines.append(f'outside = "{outside}"')
    return "\n".join(lines)


def _scenario(
    title: str,
    options: Iterable[str],
    blocks: Iterable[str],
    asked: Asked,
    outlay: Mapping[str, int | str] | None = None,
) -> Files:
    lines = [f'title = "{title}"', 'money = "crowns"', 'note = "Invented data."', ""]
    lines += ["[decisions]", f"options = {_list(options)}", ""]
    if outlay:
        pairs = ", ".join(
            f'{option} = "{amount}"' if isinstance(amount, str) else f"{option} = {amount}"
            for option, amount in outlay.items()
        )
        lines += ["[designer]", f"outlay = {{ {pairs} }}"]
    for block in blocks:
        lines += ["", block]
    lines += ["", "[demands]"]
    for key, word in asked.items():
        written = f'"{word}"' if isinstance(word, str) else _list(word)
        lines.append(f"{key} = {written}")
    return {"scenario.toml": "\n".join(lines) + "\n"}


def _list(words: Iterable[str]) -> str:
    quoted = (f'"{word}"' for word in words)
    return f"[{', '.join(quoted)}]"
