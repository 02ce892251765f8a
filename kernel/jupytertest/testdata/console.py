"""A conversation with the console, typed on a terminal."""

import sys
import unittest

import pexpect

PROMPT = r"In \[(\d+)\]: "


class Console(unittest.TestCase):
    def setUp(self):
        self.console = pexpect.spawn(
            sys.executable,
            # On a busy machine the console must wait longer than its second for an
            # answer, or it takes a complete line for an incomplete one.
            ["-m", "jupyter_console", "--kernel", "brinkline", "--simple-prompt",
             "--ZMQTerminalInteractiveShell.kernel_is_complete_timeout=60"],
            encoding="utf-8",
            timeout=60,
        )
        self.addCleanup(self.console.close, force=True)
        self.console.expect(PROMPT)

    def type(self, line):
        """Types a line and returns what is shown before the next prompt."""
        self.console.sendline(line)
        self.console.expect(PROMPT)
        return self.console.before

    def test_a_conversation(self):
        self.assertIn("hello", self.type('fmt.Println("hel" + "lo")'))
        self.assertRegex(self.type("6 * 7"), r"Out\[2\]: 42")
        self.assertIn("undefined: nothing", self.type("nothing"))
        self.assertRegex(self.type("6 * 8"), r"Out\[4\]: 48")
        self.assertIn("Sqrt", self.type("math.Sqrt?"))

    def test_an_interrupt(self):
        self.console.sendline("for {}")
        self.console.expect("for {}")
        self.console.expect(pexpect.TIMEOUT, timeout=1)  # let it run
        self.console.sendintr()
        self.console.expect("nterrupt")
        self.console.expect(PROMPT)
        self.assertRegex(self.type("6 * 7"), r"42")

    def test_the_end(self):
        self.console.sendeof()
        self.console.expect("exit")  # it asks
        self.console.sendline("y")
        self.console.expect(pexpect.EOF)


if __name__ == "__main__":
    unittest.main()
