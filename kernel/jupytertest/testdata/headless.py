"""A notebook run by the headless clients: nbclient, and nbconvert --execute."""

import subprocess
import sys
import tempfile
import unittest
from pathlib import Path

import nbclient
import nbformat

CELLS = [
    'x := 6\nfmt.Println("printed")',
    "x * 7",
    'import "os"\nfmt.Fprintln(os.Stderr, "warned");',
    "display.Show(1, 2)",
]


def notebook(cells):
    nb = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(c) for c in cells])
    nb.metadata.kernelspec = {"name": "brinkline", "display_name": "Brinkline", "language": "go"}
    return nb


class Headless(unittest.TestCase):
    def check(self, nb):
        nbformat.validate(nb)
        self.assertEqual([c.execution_count for c in nb.cells], [1, 2, 3, 4])
        outputs = [c.outputs for c in nb.cells]
        self.assertEqual(outputs[0][0].text, "printed\n")
        self.assertEqual(outputs[1][0].data, {"text/plain": "42"})
        self.assertEqual((outputs[2][0].name, outputs[2][0].text), ("stderr", "warned\n"))
        self.assertEqual([o.data["text/plain"] for o in outputs[3]], ["1", "2"])
        self.assertEqual(nb.metadata.language_info.name, "go")

    def test_nbclient(self):
        nb = notebook(CELLS)
        nbclient.NotebookClient(nb, timeout=60).execute()
        self.check(nb)

    def test_nbclient_stops_at_the_first_error(self):
        nb = notebook(["1", 'panic("here")', "2"])
        with self.assertRaises(nbclient.exceptions.CellExecutionError) as caught:
            nbclient.NotebookClient(nb, timeout=60).execute()
        self.assertIn("here", str(caught.exception))
        self.assertEqual([len(c.outputs) for c in nb.cells], [1, 1, 0])

    def test_nbclient_interrupts_a_cell_that_takes_too_long(self):
        nb = notebook(["for {}", "6 * 7"])
        nbclient.NotebookClient(nb, timeout=2, interrupt_on_timeout=True, allow_errors=True).execute()
        self.assertEqual(nb.cells[0].outputs[0].output_type, "error")
        self.assertEqual(nb.cells[1].outputs[0].data, {"text/plain": "42"})

    def test_nbconvert(self):
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / "in.ipynb"
            nbformat.write(notebook(CELLS), path)
            for arguments in (["--to", "notebook", "--output", "out.ipynb"], ["--to", "html", "--output", "out.html"]):
                subprocess.run(
                    [sys.executable, "-m", "nbconvert", "--execute", *arguments, str(path)], check=True, capture_output=True
                )
            self.check(nbformat.read(path.with_name("out.ipynb"), as_version=4))
            self.assertIn("printed", path.with_name("out.html").read_text())


if __name__ == "__main__":
    unittest.main()
