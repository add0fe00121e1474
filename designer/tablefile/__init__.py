"""Payment tables as CSV, exactly: `transfers.csv` out, and any such file back in.

A table that is read may have its columns and rows in any order, but every profile exactly
once: a lie can lead to any of them. `probability` and `pot` may be left out; where they are
there they must agree with the scenario. `decides:` columns may be left out where the scenario
itself settles every decision.

Rounded tables. An integer, a fraction or a decimal of up to five places is an amount one can
really pay, and is taken at its word. A decimal of six or more places, or one with an exponent,
marks the table as rounded; `ReadTable.tolerance` is then the most that rounding every such
entry by half a unit of its last place can do to a gain or to the pot.
"""

from designer.table import columns, rows
from designer.tablefile.package import datapackage
from designer.tablefile.reading import ReadTable, read_table
from designer.tablefile.writing import transfers_csv

__all__ = ["ReadTable", "columns", "datapackage", "read_table", "rows", "transfers_csv"]
