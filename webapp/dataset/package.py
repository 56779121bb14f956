"""Turns tables into the files of a Frictionless Data Package, and those into a zip: the same tables, the same bytes."""

import csv
import hashlib
import io
import json
import zipfile

from webapp.dataset.fields import written

# Changes when an import of this Bankside could not read what an older one wrote, or the other way round.
LAYOUT = 2
_ZIP_EPOCH = (1980, 1, 1, 0, 0, 0)


def csv_bytes(table, zone):
    """Return a table as RFC 4180 CSV in UTF-8: a header, CRLF, quotes only where needed."""
    out = io.StringIO(newline="")
    writer = csv.writer(out, lineterminator="\r\n")
    columns = [(one.name, "microseconds" if one.name in table.fine else "seconds") for one in table.fields]
    writer.writerow([name for name, _ in columns])
    writer.writerows([written(row.get(name), zone, timespec) for name, timespec in columns] for row in table.rows)
    return out.getvalue().encode("utf-8")


def content_mark(files):
    """Return a short mark of what the files hold, whatever they are called before."""
    digest = hashlib.sha256()
    for name in sorted(files):
        digest.update(name.encode() + b"\0" + hashlib.sha256(files[name]).digest())
    return digest.hexdigest()[:12]


def descriptor(about, tables, files):
    """Return datapackage.json as bytes; about holds the package's own properties."""
    package = {
        "profile": "tabular-data-package",
        **about,
        "resources": [_resource(table, files[f"{table.name}.csv"]) for table in tables],
    }
    return (json.dumps(package, ensure_ascii=False, indent=2) + "\n").encode("utf-8")


def _resource(table, content):
    schema = {
        "fields": [field.descriptor(field.name in table.fine) for field in table.fields],
        "missingValues": [""],
        "primaryKey": list(table.key),
    }
    if table.foreign:
        # In the order of the columns: the models give keys in an order that differs from one start to the next.
        places = {field.name: place for place, field in enumerate(table.fields)}
        schema["foreignKeys"] = [
            {"fields": [own], "reference": {"resource": other, "fields": [theirs]}}
            for own, (other, theirs) in sorted(table.foreign.items(), key=lambda one: places[one[0]])
        ]
    return {
        "name": table.name,
        "title": table.title,
        "description": table.says,
        "path": f"{table.name}.csv",
        "profile": "tabular-data-resource",
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "bytes": len(content),
        "rows": len(table.rows),
        "hash": f"sha256:{hashlib.sha256(content).hexdigest()}",
        "dialect": {"delimiter": ",", "lineTerminator": "\r\n", "quoteChar": '"', "doubleQuote": True, "header": True},
        "schema": schema,
    }


def checksums(files):
    """Return checksums.txt: the SHA-256 of every file, as sha256sum -c reads it."""
    return "".join(f"{hashlib.sha256(files[name]).hexdigest()}  {name}\n" for name in sorted(files)).encode("ascii")


def zipped(files):
    """Return the files as a zip whose bytes depend on nothing but them: sorted, without the time of packing."""
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED, compresslevel=6) as archive:
        for name in sorted(files):
            entry = zipfile.ZipInfo(name, _ZIP_EPOCH)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.create_system = 3
            entry.external_attr = 0o644 << 16
            archive.writestr(entry, files[name])
    return out.getvalue()
