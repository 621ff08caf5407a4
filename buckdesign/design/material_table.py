"""A core material as a row of a user's own table, in the form that the loader reads back."""

from __future__ import annotations

import csv
import io
import re
from pathlib import Path

from buckdesign.design.safe_write import write_text_new, write_text_over
from buckdesign.errors import FileAccessError
from buckdesign.parts import Material, user_folder
from buckdesign.parts.fields import Column, columns_of

ORIGIN = "# Origin: fitted to own bench readings; see source. Merged over the built-in materials.\n"


def material_csv(material: Material) -> str:
    """The table with one material.

    Parameters
    ----------
    material : Material
        The material.

    Returns
    -------
    str
        Origin, header with units and one row; empty cells for what is absent.
    """
    columns = columns_of(Material)
    sheet = io.StringIO()
    writer = csv.writer(sheet, lineterminator="\n")
    writer.writerow(column.header for column in columns.values())
    writer.writerow(_cell(column, getattr(material, name)) for name, column in columns.items())
    return ORIGIN + sheet.getvalue()


def material_file(material: Material) -> Path:
    """Where a user's material is kept: the folder of own tables, which every command reads.

    Parameters
    ----------
    material : Material
        The material.

    Returns
    -------
    Path
        One file for each name.
    """
    slug = re.sub(r"[^a-z0-9]+", "-", material.name.casefold()).strip("-")
    return user_folder() / f"material-{slug}.csv"


def store_material(material: Material, path: Path | None = None, *, force: bool = False) -> Path:
    """Write a material's table, whole or not at all.

    Parameters
    ----------
    material : Material
        The material.
    path : Path, optional
        File to write; `material_file` where omitted, its folder is made.
    force : bool
        Replace a file with another content.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    FileAccessError
        The file exists with another content, or can't be written.
    """
    target, text = path or material_file(material), material_csv(material)
    if path is None:
        try:
            target.parent.mkdir(parents=True, exist_ok=True)
        except OSError as error:
            raise FileAccessError(target.parent, f"can't be made: {error.strerror or error}") from None
    if _holds(target, text):
        return target
    if force:
        write_text_over(target, text)
    else:
        write_text_new(target, text)
    return target


def _holds(path: Path, text: str) -> bool:
    try:
        return path.is_file() and path.read_text(encoding="utf-8") == text
    except (OSError, UnicodeDecodeError):
        return False


def _cell(column: Column, value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, float | int):
        return f"{value * 100.0 if column.unit == '%' else value:.9g}"
    return str(value)
