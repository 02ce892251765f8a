"""Runs a notebook through the registered kernel by a reference client.

usage: client.py nbclient|nbconvert IN.ipynb OUT.ipynb

Front ends merge adjacent streams of one name and show no times; the file is
brought into that form. The live displays of long work, which are there or not
as the machine is slow or fast, are left out.
"""

import os
import subprocess
import sys

import nbformat
from nbclient import NotebookClient


def by_nbclient(path):
    nb = nbformat.read(path, as_version=nbformat.NO_CONVERT)
    resources = {"metadata": {"path": os.path.dirname(os.path.abspath(path))}}
    NotebookClient(nb, kernel_name="brinkline", timeout=120, resources=resources, record_timing=False).execute()
    return nb


def by_nbconvert(path, out):
    folder, name = os.path.split(os.path.abspath(out))
    subprocess.run(
        ["jupyter", "nbconvert", "--to", "notebook", "--execute", "--ExecutePreprocessor.kernel_name=brinkline",
         path, "--output-dir", folder, "--output", name],
        check=True, capture_output=True,
    )
    return nbformat.read(out, as_version=nbformat.NO_CONVERT)


def is_live(out):
    return out.get("metadata", {}).get("brinkline", {}).get("progress", False)


def merged(outputs):
    kept = []
    for out in outputs:
        if is_live(out):
            continue
        if kept and out.output_type == "stream" == kept[-1].output_type and out.name == kept[-1].name:
            kept[-1].text += out.text
        else:
            kept.append(out)
    return kept


client, source, target = sys.argv[1:]
nb = by_nbclient(source) if client == "nbclient" else by_nbconvert(source, target)
for cell in nb.cells:
    cell.metadata.pop("execution", None)
    if cell.cell_type == "code":
        cell.outputs = merged(cell.outputs)
nbformat.write(nb, target)
