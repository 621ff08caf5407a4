"""A finished table as Parquet, written and read in pieces; needs pyarrow."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from buckdesign.errors import FileAccessError, InputError
from buckdesign.studies.table_file import Kind

if TYPE_CHECKING:
    import pandas as pd

BLOCK_BYTES = 4 << 20
"""Bytes of CSV that become one row group (own choice: memory stays flat with it, and grew with four times as many)."""


def require_pyarrow() -> None:
    """Make sure that Parquet can be written, before hours of work go into a table.

    Raises
    ------
    InputError
        pyarrow is not installed.
    """
    try:
        import pyarrow.csv
        import pyarrow.parquet  # noqa: F401
    except ImportError:
        raise InputError(
            'a Parquet file needs pyarrow: install "buckdesign[parquet]", or give a name that ends with .csv'
        ) from None


def write_parquet(source: Path, target: Path, kinds: Mapping[str, Kind]) -> None:
    """Convert a CSV to Parquet, in pieces, and see it on disk.

    Parameters
    ----------
    source : pathlib.Path
        The CSV.
    target : pathlib.Path
        The file to make or overwrite.
    kinds : mapping of str to Kind
        The columns in order; empty cells become nulls, empty texts stay texts.

    Raises
    ------
    OSError
        It can't be written.
    InputError
        The CSV is no table with these columns.
    """
    import pyarrow as pa
    import pyarrow.csv
    import pyarrow.parquet

    schema = pa.schema([(name, _arrow_type(kind)) for name, kind in kinds.items()])
    convert = pyarrow.csv.ConvertOptions(
        column_types=schema,
        null_values=[""],
        true_values=["true"],
        false_values=["false"],
        strings_can_be_null=False,
    )
    try:
        with (
            target.open("wb") as file,
            pyarrow.parquet.ParquetWriter(file, schema) as writer,
            pyarrow.csv.open_csv(
                source,
                read_options=pyarrow.csv.ReadOptions(block_size=BLOCK_BYTES),
                parse_options=pyarrow.csv.ParseOptions(newlines_in_values=True),
                convert_options=convert,
            ) as batches,
        ):
            for batch in batches:
                writer.write_batch(batch)
            writer.close()
            file.flush()
            os.fsync(file.fileno())
    except pa.ArrowInvalid as error:
        raise InputError(f"{source}: is not the table it should be: {' '.join(str(error).split())}") from None


def read_parquet(path: Path, wanted: Sequence[str], rows: int) -> Iterator[pd.DataFrame]:
    """Columns of a Parquet file in pieces.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    wanted : sequence of str
        Columns.
    rows : int
        Most rows at once.

    Yields
    ------
    DataFrame
        Numbers, truths and texts; what is missing as pandas has it.

    Raises
    ------
    FileAccessError
        It can't be read.
    InputError
        It is no Parquet file with these columns, or pyarrow is missing.
    """
    require_pyarrow()
    import pyarrow as pa
    import pyarrow.parquet

    try:
        with pyarrow.parquet.ParquetFile(path) as file:
            missing = [name for name in wanted if name not in file.schema_arrow.names]
            if missing:
                raise InputError(f"{path}: has no column {missing[0]}")
            for batch in file.iter_batches(batch_size=rows, columns=list(wanted)):
                yield batch.to_pandas(types_mapper=_pandas_types().get)
    except pa.ArrowInvalid as error:
        raise InputError(f"{path}: is no Parquet file: {' '.join(str(error).split())}") from None
    except OSError as error:
        raise FileAccessError(path, f"can't be read: {error.strerror or error}") from None


def _pandas_types() -> dict[Any, Any]:
    """Dtypes that keep what is missing apart from what is false or zero."""
    import pandas as pd
    import pyarrow as pa

    return {pa.int64(): pd.Int64Dtype(), pa.bool_(): pd.BooleanDtype()}


def _arrow_type(kind: Kind) -> Any:
    import pyarrow as pa

    return {"float": pa.float64(), "int": pa.int64(), "text": pa.string(), "bool": pa.bool_()}[kind]
