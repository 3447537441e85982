"""Tables in a folder that describes itself: CSV, Parquet, and a tabular data package descriptor.

The descriptor follows the open Data Package and Table Schema specifications (https://specs.frictionlessdata.io,
version 1); units stand as ``unit`` beside each field's type and description.
"""

from __future__ import annotations

import hashlib
import json
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from scission.handover.combine import CAMPAIGN, Campaigns
from scission.handover.opened import OpenCampaign
from scission.records.atomic import replacing, write_whole
from scission.tables import COLUMNS, Column
from scission.tables.write import write_csv

DESCRIPTOR = "datapackage.json"
GEOMETRIES = "geometries.xyz"

_TYPES = {"str": "string", "float": "number", "int": "integer", "bool": "boolean"}
_ARROW = {"str": pa.string(), "float": pa.float64(), "int": pa.int64(), "bool": pa.bool_()}
_PRIMARY = {"points": ("scan", "level", "point")}


def write_package(source: OpenCampaign | Campaigns, folder: Path, geometries: bool = False) -> list[Path]:
    """Write every table as CSV and Parquet into ``folder`` and, last, the descriptor of the CSV files.

    Args:
        source: one campaign, or several as one; then every table has a first column ``campaign``.
        folder: made if it is not there; files of the same names are replaced, each whole.
        geometries: also write all geometries as extended XYZ.

    Raises:
        OSError: the folder cannot be written.
    """
    written, resources = [], []
    for name, table in source.tables.items():
        columns = tuple(c for c in (CAMPAIGN, *COLUMNS[name]) if c.name in table.columns)
        table = table[[column.name for column in columns]]
        path = write_csv(table, folder / f"{name}.csv")
        written += [path, _write_parquet(table, columns, folder / f"{name}.parquet")]
        resources.append(_resource(name, path, columns))
    if geometries:
        path = folder / GEOMETRIES
        source.write_extxyz(path)
        written.append(path)
        resources.append(_file(path) | {"name": "geometries", "format": "extxyz"})
    text = json.dumps(_descriptor(source, resources), indent=1, ensure_ascii=False)
    write_whole(folder / DESCRIPTOR, text.encode("utf-8"))
    return [*written, folder / DESCRIPTOR]


def _descriptor(source: OpenCampaign | Campaigns, resources: list[dict[str, Any]]) -> dict[str, Any]:
    names = [c.name for c in source.members] if isinstance(source, Campaigns) else [source.name]
    return {
        "profile": "tabular-data-package",
        "name": "-".join(names).lower().replace("_", "-"),
        "title": f"Bond scans: {', '.join(names)}",
        "created": datetime.now(UTC).isoformat(timespec="seconds").replace("+00:00", "Z"),
        "resources": resources,
    }


def _resource(name: str, path: Path, columns: tuple[Column, ...]) -> dict[str, Any]:
    schema: dict[str, Any] = {"fields": [_field(column) for column in columns], "missingValues": [""]}
    if name in _PRIMARY:
        owner = (CAMPAIGN.name,) if CAMPAIGN in columns else ()
        schema["primaryKey"] = [*owner, *_PRIMARY[name]]
    kind = {"profile": "tabular-data-resource", "format": "csv", "mediatype": "text/csv"}
    return {"name": name.replace("_", "-"), **_file(path), **kind, "encoding": "utf-8", "schema": schema}


def _file(path: Path) -> dict[str, Any]:
    with path.open("rb") as handle:
        digest = hashlib.file_digest(handle, "sha256").hexdigest()
    return {"path": path.name, "bytes": path.stat().st_size, "hash": f"sha256:{digest}"}


def _field(column: Column) -> dict[str, str]:
    return {
        "name": column.name,
        "type": _TYPES[column.dtype],
        "unit": column.unit,
        "description": column.meaning,
    }


def _write_parquet(table: pd.DataFrame, columns: tuple[Column, ...], path: Path) -> Path:
    fields = [
        pa.field(c.name, _ARROW[c.dtype], metadata={"unit": c.unit, "meaning": c.meaning}) for c in columns
    ]
    content = pa.Table.from_pandas(table, schema=pa.schema(fields), preserve_index=False)
    with replacing(path) as temporary:
        pq.write_table(content, temporary)
    return path
