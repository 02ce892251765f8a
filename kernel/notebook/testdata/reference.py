"""Writes reference.ipynb with the reference implementation of the notebook format."""

import sys

import nbformat
from nbformat.v4 import new_code_cell, new_markdown_cell, new_notebook, new_output, new_raw_cell

markdown = new_markdown_cell("# A tank\n\nline two — é λ \u2028 sep\n", id="intro-1")
code = new_code_cell(
    '// the tank\nx := 1 < 2 && true\n\tfmt.Println(x)',
    id="Code_Cell-2",
    metadata={"tags": ["parameters"], "unknown": {"z": 1}},
    execution_count=1,
    outputs=[
        new_output("stream", name="stdout", text='true\nform\ffeed \x01 "quoted" back\\slash\ttab\r\nlast'),
        new_output(
            "display_data",
            data={
                "text/html": "<b>\n&amp;</b>",
                "image/png": "aGFsbG8K\nYQ==",
                "application/vnd.x+json": {"b": "l1\nl2", "a": [1.5]},
                "text/plain": "a\nb",
                "image/svg+xml": "<svg>\n</svg>",
            },
            metadata={"image/png": {"alt": "a picture"}},
        ),
        new_output("execute_result", data={"text/plain": "3"}, execution_count=1),
        new_output("error", ename="E", evalue="v", traceback=["a", "b\nc"]),
    ],
)
notebook = new_notebook(
    cells=[markdown, code, new_raw_cell("raw text", id="raw")],
    metadata={
        "kernelspec": {"name": "brinkline", "display_name": "Brinkline", "language": "go"},
        "language_info": {"name": "go", "version": "1.0"},
        "house": {"b": [1, 2.5, 1e-7, {}], "a": None, "t": True, "empty": []},
    },
)
nbformat.validate(notebook)
nbformat.write(notebook, sys.argv[1])
