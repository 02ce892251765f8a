"""What the kernel answers to the reference client."""

import os
import tempfile
import time
import unittest

import zmq
import zmq.utils.monitor
from jupyter_client import KernelManager

from common import PATIENCE, KernelCase


class Cells(KernelCase):
    def test_kernel_info(self):
        info = self.client.kernel_info(reply=True, timeout=PATIENCE)["content"]
        self.assertEqual(info["protocol_version"], "5.5")
        self.assertEqual(info["implementation"], "brinkline")
        self.assertEqual(info["language_info"]["name"], "go")

    def test_streams(self):
        reply, outputs = self.run_cell('import "os"\nfmt.Println("to out")\nfmt.Fprintln(os.Stderr, "to err");')
        self.assertEqual(reply["status"], "ok")
        self.assertEqual(self.streams(outputs, "stdout"), "to out\n")
        self.assertEqual(self.streams(outputs, "stderr"), "to err\n")

    def test_value(self):
        reply, outputs = self.run_cell("a := 6\na * 7")
        self.assertEqual([(k, c["data"]) for k, c in outputs], [("execute_result", {"text/plain": "42"})])
        self.assertEqual(outputs[0][1]["execution_count"], reply["execution_count"])

    def test_error(self):
        for code, line in (("undefinedName", "line 1"), ("s := []int{}\n_ = s[3]", "line 2"), ('panic("why")', "line 1")):
            reply, outputs = self.run_cell(code)
            self.assertEqual(reply["status"], "error")
            self.assertEqual([k for k, _ in outputs], ["error"])
            for key in ("ename", "evalue", "traceback"):
                self.assertEqual(outputs[0][1][key], reply[key])
            self.assertIn(line, "\n".join(reply["traceback"]))
        self.assertEqual(self.run_cell("1 + 1")[0]["status"], "ok")

    def test_user_expressions(self):
        reply, _ = self.run_cell("b := 2", user_expressions={"good": "b + 1", "bad": "c + 1"})
        self.assertEqual(reply["status"], "ok")
        values = reply["user_expressions"]
        self.assertEqual(values["good"]["data"]["text/plain"], "3")
        self.assertEqual(values["bad"]["status"], "error")

    def test_silent(self):
        count = self.run_cell("1")[0]["execution_count"]
        reply, outputs = self.run_cell('fmt.Println("quiet")\n2', silent=True)
        self.assertEqual((reply["status"], reply["execution_count"], outputs), ("ok", count, []))

    def test_a_late_goroutine(self):
        late = self.send('go func() { time.Sleep(300 * time.Millisecond); fmt.Println("late") }()')
        self.reply(late)
        self.outputs(late)
        self.run_cell("1")
        message = self.client.get_iopub_msg(timeout=PATIENCE)
        self.assertEqual((message["content"].get("text"), message["parent_header"]["msg_id"]), ("late\n", late))

    def test_a_panic_of_a_goroutine_is_survived(self):
        self.run_cell('go func() { panic("in the background") }()\ntime.Sleep(50 * time.Millisecond)')
        self.assertEqual(self.run_cell("1 + 1")[0]["status"], "ok")

    def test_history(self):
        self.run_cell('fmt.Print("for the history")')
        request = self.client.history(hist_access_type="tail", n=1, raw=True, output=False)
        self.assertEqual([h[2] for h in self.reply(request)["history"]], ['fmt.Print("for the history")'])


class Questions(KernelCase):
    def test_complete(self):
        self.run_cell("inflowRate := 3.0\nβwidth := 1.0")
        for code, cursor, matches, place in (
            ("y := inflowR", None, ["inflowRate"], (5, 12)),
            ("s := \"\U0001F600\"; βwi", None, ["βwidth"], (10, 13)),
            ("inflowR + 1", 7, ["inflowRate"], (0, 7)),
        ):
            reply = self.reply(self.client.complete(code, cursor))
            self.assertEqual(reply["status"], "ok")
            self.assertEqual(reply["matches"], matches, code)
            self.assertEqual((reply["cursor_start"], reply["cursor_end"]), place, code)

    def test_is_complete(self):
        for code, status in (("x := 1", "complete"), ("for {", "incomplete"), ("x := )", "invalid")):
            self.assertEqual(self.reply(self.client.is_complete(code))["status"], status, code)

    def test_answers_while_a_cell_runs(self):
        loop = self.send("for {}")
        self.started(loop)
        began = time.monotonic()
        self.assertIn("Sqrt", self.reply(self.client.complete("math.Sqr"))["matches"])
        self.assertEqual(self.reply(self.client.kernel_info())["status"], "ok")
        self.assertLess(time.monotonic() - began, 1)
        self.manager.interrupt_kernel()
        self.assertEqual(self.reply(loop)["status"], "error")


class Interrupts(KernelCase):
    def interrupted(self, code, after=0.2):
        """Interrupts a cell and returns how long it took to end."""
        cell = self.send(code)
        queued = [self.send("fmt.Println(1)"), self.send("2")]
        self.started(cell)
        time.sleep(after)
        began = time.monotonic()
        self.manager.interrupt_kernel()
        reply = self.reply(cell)
        took = time.monotonic() - began
        self.assertEqual(reply["status"], "error")
        self.assertIn("nterrupt", reply["ename"])
        for request in queued:
            self.assertEqual(self.reply(request), {"status": "aborted"})
        self.assertEqual(self.run_cell("1 + 1")[0]["status"], "ok")
        return took

    def interrupted_soon(self, code, after=0.2):
        """Interrupts a cell, which must end within 0.2 s; a busy machine gets three tries."""
        self.assertLess(min(self.interrupted(code, after) for _ in range(3)), 0.2)

    def test_an_endless_loop(self):
        self.interrupted_soon("kept := 5\nfor {}")
        self.assertEqual(self.run_cell("kept")[1][0][1]["data"]["text/plain"], "5")

    def test_a_sleep(self):
        self.interrupted_soon("time.Sleep(time.Hour)")

    def test_a_long_branch_is_kept_as_far_as_it_goes(self):
        self.assertEqual(self.run_cell(LONG_MODEL)[0]["status"], "ok")
        self.interrupted_soon(LONG_FOLLOW, after=1)
        reply, outputs = self.run_cell("len(path.Points()) > 1")
        self.assertEqual(reply["status"], "ok", reply)
        self.assertEqual(outputs[0][1]["data"]["text/plain"], "true")
        reply, outputs = self.run_cell("path")
        self.assertIn("interrupted at Load", outputs[0][1]["data"]["text/plain"])
        self.assertIn("image/svg+xml", outputs[0][1]["data"])


# A model that takes its time, and a branch with far more steps than the test waits for.
LONG_MODEL = """
type State struct{ X float64 }
type Params struct{ Load float64 }
func slow(s State, q Params) State { time.Sleep(200 * time.Microsecond); return State{q.Load - s.X} }
model := continuation.NewModel(slow, Params{0})
start := model.Settle(State{0.1})
"""
LONG_FOLLOW = """
path := start.Follow("Load", continuation.Within(0, 1e6), continuation.StepBetween(1e-6, 1e-2), continuation.MaxSteps(1000000))
"""


class Life(KernelCase):
    @classmethod
    def tearDownClass(cls):
        cls.client.stop_channels()

    def test_restart_and_shutdown(self):
        self.run_cell("gone := 1")
        first = self.run_cell('import "os"\nos.Getpid()')[1][0][1]["data"]["text/plain"]
        self.manager.restart_kernel()
        self.client.wait_for_ready(timeout=PATIENCE)
        second = self.run_cell('import "os"\nos.Getpid()')[1][0][1]["data"]["text/plain"]
        self.assertNotEqual(first, second)
        reply, _ = self.run_cell("gone")
        self.assertEqual(reply["status"], "error")
        began = time.monotonic()
        self.manager.shutdown_kernel()
        self.assertLess(time.monotonic() - began, 2.5, "it was ended by force")
        self.assertFalse(self.manager.is_alive())
        self.assertFalse(os.path.exists("/proc/" + second))


class Sockets(unittest.TestCase):
    """What the reference client's own sockets see."""

    def start(self, **options):
        manager = KernelManager(kernel_name="brinkline", **options)
        manager.start_kernel()
        self.addCleanup(manager.shutdown_kernel, now=True)
        return manager

    def test_socket_files(self):
        with tempfile.TemporaryDirectory() as folder:
            manager = self.start(transport="ipc", ip=os.path.join(folder, "k"))
            client = manager.client()
            client.start_channels()
            client.wait_for_ready(timeout=PATIENCE)
            self.assertEqual(client.execute_interactive("1 + 1", timeout=PATIENCE)["content"]["status"], "ok")
            files = [f for f in os.listdir(folder) if f.startswith("k-")]
            self.assertEqual(len(files), 5)
            self.assertFalse(any(os.stat(os.path.join(folder, f)).st_mode & 0o077 for f in files))
            client.stop_channels()
            manager.shutdown_kernel()
            self.assertEqual([f for f in os.listdir(folder) if f.startswith("k-")], [])

    def test_several_clients(self):
        manager = self.start()
        clients = [manager.client() for _ in range(3)]
        for client in clients:
            client.start_channels()
            client.wait_for_ready(timeout=PATIENCE)
        request = clients[0].execute('fmt.Println("for all")')
        self.assertEqual(clients[0].get_shell_msg(timeout=PATIENCE)["parent_header"]["msg_id"], request)
        for client in clients:
            while True:
                message = client.get_iopub_msg(timeout=PATIENCE)
                if message["msg_type"] == "stream":
                    self.assertEqual(message["content"]["text"], "for all\n")
                    self.assertEqual(message["parent_header"]["msg_id"], request)
                    break
            client.stop_channels()

    def test_zeromq_heartbeats(self):
        manager = self.start()
        context = zmq.Context()
        self.addCleanup(context.destroy, linger=0)
        dealer = context.socket(zmq.DEALER)
        dealer.setsockopt(zmq.HEARTBEAT_IVL, 50)
        dealer.setsockopt(zmq.HEARTBEAT_TIMEOUT, 300)
        monitor = dealer.get_monitor_socket()
        info = manager.get_connection_info()
        dealer.connect(f"tcp://{info['ip']}:{info['shell_port']}")
        time.sleep(1.5)
        events = []
        while monitor.poll(0):
            events.append(zmq.utils.monitor.recv_monitor_message(monitor)["event"])
        self.assertIn(zmq.EVENT_HANDSHAKE_SUCCEEDED, events)
        self.assertNotIn(zmq.EVENT_DISCONNECTED, events)


if __name__ == "__main__":
    unittest.main()
