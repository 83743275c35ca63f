"""What Apache Arrow reads from the sample file, as JSON: values (doubles as hexadecimal), types, row group bounds.

    npx tsx test/reference/parquet/write-sample.ts /tmp/sample.parquet
    python3 test/reference/parquet/read.py /tmp/sample.parquet > test/reference/parquet/read.json
"""
import hashlib
import json
import sys

import pyarrow
import pyarrow.parquet

path = sys.argv[1]
file = pyarrow.parquet.ParquetFile(path)
table = file.read()


def cell(value):
    return value.hex() if isinstance(value, float) else value


groups = []
for g in range(file.num_row_groups):
    group = file.metadata.row_group(g)
    bounds = {}
    for c in range(group.num_columns):
        column = group.column(c)
        s = column.statistics
        bounds[column.path_in_schema] = [cell(s.min), cell(s.max), s.null_count] if s.has_min_max else [None, None, s.null_count]
    groups.append({"rows": group.num_rows, "bounds": bounds})

with open(path, "rb") as raw:
    digest = hashlib.sha256(raw.read()).hexdigest()

json.dump(
    {
        "reader": f"pyarrow {pyarrow.__version__}",
        "sha256": digest,
        "types": {f.name: [str(f.type), f.nullable] for f in table.schema},
        "groups": groups,
        "columns": {name: [cell(v) for v in table.column(name).to_pylist()] for name in table.column_names},
    },
    sys.stdout,
    ensure_ascii=False,
    indent=1,
)
