"""A kernel started by the reference client, and helpers to talk to it."""

import time
import unittest

from jupyter_client.manager import start_new_kernel

PATIENCE = 20  # seconds


class KernelCase(unittest.TestCase):
    """One kernel for all tests of a class."""

    @classmethod
    def setUpClass(cls):
        cls.manager, cls.client = start_new_kernel(kernel_name="brinkline", startup_timeout=PATIENCE)

    @classmethod
    def tearDownClass(cls):
        cls.client.stop_channels()
        cls.manager.shutdown_kernel()

    def send(self, code, **options):
        """Sends a cell and returns the id of the request."""
        return self.client.execute(code, **options)

    def reply(self, request):
        """Returns the content of the next reply, which must answer the request."""
        message = self.client.get_shell_msg(timeout=PATIENCE)
        self.assertEqual(message["parent_header"]["msg_id"], request, message["content"])
        return message["content"]

    def outputs(self, request):
        """Returns what answers a request on IOPub, up to idle."""
        messages = []
        while True:
            message = self.client.get_iopub_msg(timeout=PATIENCE)
            if message["parent_header"].get("msg_id") != request:
                continue
            kind, content = message["msg_type"], message["content"]
            if kind == "status" and content["execution_state"] == "idle":
                return messages
            messages.append((kind, content))

    def run_cell(self, code, **options):
        """Runs a cell and returns the content of its reply and its outputs."""
        request = self.send(code, **options)
        reply = self.reply(request)
        outputs = self.outputs(request)
        return reply, [o for o in outputs if o[0] not in ("status", "execute_input")]

    def started(self, request):
        """Waits until the cell of a request runs."""
        while True:
            message = self.client.get_iopub_msg(timeout=PATIENCE)
            if message["msg_type"] == "execute_input" and message["parent_header"]["msg_id"] == request:
                time.sleep(0.1)  # from the message to the first statement
                return

    def streams(self, outputs, name):
        return "".join(c["text"] for kind, c in outputs if kind == "stream" and c["name"] == name)
