"""A process that solves programs with PuLP: a line of JSON in, a line of JSON out.

Run as a file, so that it needs PuLP and the standard library alone. In: `solver`, `seconds`
(or null) and `program`, PuLP's own dictionary. Out: `status` and `values` by column name, or
`failed` with the engine's words. It ends, and takes its folder away, when stdin does.
"""

from __future__ import annotations

import json
import os
import shutil
import sys
import warnings
from typing import Any


def solve(asked: dict[str, Any]) -> dict[str, Any]:
    """Solve the program asked for."""
    import pulp

    # the user chose this engine by name: that PuLP 4 drops it is no news to act on
    warnings.simplefilter("ignore", DeprecationWarning)
    options: dict[str, Any] = {"msg": False}
    if asked["seconds"] is not None:
        options["timeLimit"] = asked["seconds"]
    columns, problem = pulp.LpProblem.fromDict(asked["program"])
    try:
        said = problem.solve(pulp.getSolver(asked["solver"], **options))
    except (pulp.PulpSolverError, OSError, RuntimeError, ValueError) as error:
        return {"failed": str(error)}
    values = {name: column.varValue for name, column in columns.items()}
    # PuLP 4 returns statistics, earlier ones the status itself
    return {"status": int(getattr(said, "status", said)), "values": values}


def main() -> None:
    """Keep stdout for the answers: engines write on it as they please."""
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, 1)
    for question in sys.stdin:
        answers.write(f"{json.dumps(solve(json.loads(question)))}\n")
        answers.flush()
    shutil.rmtree(os.getcwd(), ignore_errors=True)
    os._exit(0)  # engines may leave threads behind


if __name__ == "__main__":
    main()
