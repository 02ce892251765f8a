"""Lets the reference client turn messages into outputs: JSON in, JSON out."""

import json
import sys

from nbclient import NotebookClient
from nbformat.v4 import new_code_cell, new_notebook
from nbformat.v4.rwbase import split_lines


def content(m):
    bundle = {"data": {"text/plain": m["text"]}, "metadata": {}}
    if m["id"]:
        bundle["transient"] = {"display_id": m["id"]}
    return {
        "stream": {"name": m["name"], "text": m["text"]},
        "display_data": bundle,
        "update_display_data": bundle,
        "clear_output": {"wait": m["wait"]},
        "execute_result": {"data": {"text/plain": m["text"]}, "metadata": {}, "execution_count": m["cell"] + 1},
        "error": {"ename": "E", "evalue": m["text"], "traceback": ["E: " + m["text"]]},
    }[m["type"]]


def merged(outputs):
    kept = []
    for out in outputs:
        if kept and out.output_type == "stream" == kept[-1].output_type and out.name == kept[-1].name:
            kept[-1].text += out.text
        else:
            kept.append(out)
    return kept


def play(messages):
    nb = new_notebook(cells=[new_code_cell() for _ in range(3)])
    client = NotebookClient(nb)
    client.reset_execution_trackers()
    playing = None
    for m in messages:
        if m["cell"] != playing:
            playing, client.clear_before_next_output = m["cell"], False
        message = {"msg_type": m["type"], "header": {"msg_type": m["type"]}, "parent_header": {"msg_id": "x"}, "content": content(m)}
        client.process_message(message, nb.cells[playing], playing)
    for cell in nb.cells:
        cell.outputs = merged(cell.outputs)
    return [cell.outputs for cell in split_lines(nb).cells]


json.dump([play(messages) for messages in json.load(sys.stdin)], sys.stdout)
