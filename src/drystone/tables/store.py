"""Parquet in and out: validated, byte-identical across repeats, never half written."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pandera.pandas as pa
import pyarrow as arrow
import pyarrow.parquet as parquet

from drystone.tables.atomic import replacing


class TableError(ValueError):
    """A table does not look as its schema says."""


def write_table(table: pd.DataFrame, path: Path, schema: pa.DataFrameSchema | None = None) -> None:
    """Write ``table`` to ``path`` in one move, after checking it against ``schema``.

    Raises
    ------
    TableError
        When a column is missing, unknown or holds a value that the schema does not allow.
    """
    checked = conform(table, schema) if schema is not None else table
    stored = arrow.Table.from_pandas(checked, preserve_index=False).replace_schema_metadata(None)
    with replacing(path) as partial:
        parquet.write_table(stored, partial, compression="zstd")


def read_table(path: Path, schema: pa.DataFrameSchema | None = None) -> pd.DataFrame:
    """Read a table written by `write_table`, with the schema's column types."""
    table = parquet.read_table(path, partitioning=None).to_pandas()
    return conform(table, schema) if schema is not None else table


def empty_table(schema: pa.DataFrameSchema) -> pd.DataFrame:
    """Table with the columns of ``schema`` and no row."""
    return conform(pd.DataFrame({name: [] for name in schema.columns}), schema)


def conform(table: pd.DataFrame, schema: pa.DataFrameSchema) -> pd.DataFrame:
    """Return ``table`` with the schema's columns, in its order, types coerced and checked."""
    try:
        ordered = table[list(schema.columns)]
        return schema.validate(ordered.reset_index(drop=True), lazy=True)
    except KeyError as error:
        raise TableError(f"table '{schema.name}': {error.args[0]}") from error
    except (pa.errors.SchemaErrors, pa.errors.SchemaError) as error:
        raise TableError(f"table '{schema.name}': {_first_failure(error)}") from error


def _first_failure(error: Exception) -> str:
    cases = getattr(error, "failure_cases", None)
    if isinstance(cases, pd.DataFrame) and len(cases):
        case = cases.iloc[0]
        value = case.get("failure_case")
        return f"column {case.get('column')}: {case.get('check')} fails for {value!r}"
    return str(error).splitlines()[0]
