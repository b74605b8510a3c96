"""The live plot on real streams, without a screen."""
import contextlib
import io
import os
import signal
import threading
import unittest

os.environ["MPLBACKEND"] = "Agg"
import matplotlib.image
import matplotlib.pyplot as plt
import numpy as np
from command import CONVEYOR, MAINS, PATIENCE_S, Folder, start
from matplotlib.backend_bases import KeyEvent

from slipbench_client import ClientError, Stream
from slipbench_client.figure import COLOURS, Figure
from slipbench_client.history import outline
from slipbench_client.live import follow, main


def colours(path):
    """{hex colour: number of points} of a picture."""
    image = (np.round(matplotlib.image.imread(path)[:, :, :3] * 255)).astype(int).reshape(-1, 3)
    values, counts = np.unique(image @ [65536, 256, 1], return_counts=True)
    return {f"#{value:06X}": count for value, count in zip(values, counts)}


class Live(unittest.TestCase):
    def setUp(self):
        self.folder = Folder(self)
        self.endpoint, self.picture = self.folder.endpoint, str(self.folder.path / "out.png")
        self.addCleanup(plt.close, "all")

    def publish(self, scenario, *arguments, wait=1):
        return start(self, "run", scenario, "--publish", self.endpoint, "--publish-wait", wait, *arguments)

    def live(self, *arguments, status=0):
        error = io.StringIO()
        with contextlib.redirect_stderr(error):
            self.assertEqual(main([self.endpoint, *arguments]), status, error.getvalue())
        return error.getvalue()

    def test_the_last_picture_shows_every_line(self):
        self.publish(CONVEYOR)
        self.live("--columns", "speed_reference_rpm,ekf.speed_rpm,torque_Nm", "--window", "4", "--save", self.picture)
        found = colours(self.picture)
        # The reference, ekf (above and below), the torque, then luenberger and reduced: a line across 800 points each.
        for colour in COLOURS[:5]:
            self.assertGreater(found.get(colour, 0), 100, colour)
        self.assertNotIn(COLOURS[6], found)

    def test_what_the_lines_say(self):
        self.publish(MAINS)
        figure = Figure(plt, window_s=0.5)
        with Stream(self.endpoint) as stream:
            self.assertEqual(follow(stream, figure, ["speed_rpm", "torque_Nm"], silent_s=PATIENCE_S), "over")
        self.publish(MAINS)
        with Stream(self.endpoint) as stream:
            trace = stream.read_all().between(1.5, 2.0)
        figure.draw()
        np.testing.assert_array_equal(figure.lines["torque_Nm"].get_xydata(), trace.array(["time_s", "torque_Nm"]))
        self.assertEqual(list(figure.errors), ["luenberger", "reduced", "ekf"])
        np.testing.assert_array_equal(figure.errors["ekf"].get_ydata(), trace.ekf.speed_rpm - trace.speed_rpm)
        left, below, right = figure.axes
        self.assertEqual([axis.get_ylabel() for axis in figure.axes],
                         ["mechanical speed, rpm", "estimated minus\ntrue speed, rpm", "electromagnetic torque, N m"])
        self.assertEqual(below.get_xlabel(), "time, s")
        self.assertEqual(left.get_xlim(), (1.5, 2.0))
        self.assertIn("done: 2001 rows", figure.figure._suptitle.get_text())  # get_suptitle() comes with matplotlib 3.8

    def test_a_stopped_publisher_is_given_up_and_its_picture_kept(self):
        run = self.publish(CONVEYOR, "--pace", 1, wait=2)

        def stop_it():
            with Stream(self.endpoint) as stream:
                next(block for block in stream if block.first_tick > 500)
                run.send_signal(signal.SIGSTOP)
        stopper = threading.Thread(target=stop_it)
        stopper.start()
        error = self.live("--save", self.picture, "--timeout", "2", status=3)
        stopper.join()
        self.assertIn("nothing for 2 s and no end", error)
        self.assertGreater(colours(self.picture)[COLOURS[0]], 100)

    def test_keys_and_closing(self):
        self.publish(CONVEYOR, "--pace", 0.1)  # far longer than 30 pictures take
        figure = Figure(plt, window_s=5.0)
        figure.shown = True  # as on a screen: draws under way
        drawn = []
        draw = figure.draw

        def spy():
            draw()
            drawn.append(len(figure.lines["speed_rpm"].get_xdata()) if figure.lines else 0)
            key = {10: " ", 20: " ", 30: "q"}.get(len(drawn))
            if key:
                canvas = figure.figure.canvas
                canvas.callbacks.process("key_press_event", KeyEvent("key_press_event", canvas, key))
        figure.draw = spy
        with Stream(self.endpoint) as stream:
            self.assertEqual(follow(stream, figure, [], silent_s=PATIENCE_S), "closed")
        self.assertEqual(len(drawn), 30)
        self.assertEqual(len(set(drawn[9:20])), 1, "held between the first and the second space")
        self.assertGreater(drawn[29], drawn[9])
        estimated = [f"{name}.speed_rpm" for name in ("luenberger", "reduced", "ekf")]
        self.assertEqual(list(figure.lines), ["speed_reference_rpm", "speed_rpm", *estimated])

    def test_wrong_use_is_told(self):
        self.assertIn("there is no display here: give --save", self.live(status=2))
        for arguments, sentence in ((["--columns", "sped_rpm"], "did you mean speed_rpm"),
                                    (["--columns", "time_s,speed_rpm,torque_Nm"], "a panel has room for two units")):
            self.endpoint += "x"
            self.publish(MAINS)
            self.assertIn(sentence, self.live(*arguments, "--save", self.picture, status=2))
        self.assertIn("above 0", self.live("--window", "0", "--save", self.picture, status=2))
        self.endpoint += "y"
        self.publish(MAINS)
        self.assertIn("No such file", self.live("--save", f"{self.folder.path}/none/out.png", status=3))
        self.assertIn("ending tells the format", self.live("--save", f"{self.folder.path}/out.xyz", status=2))
        self.assertRaises(ClientError, Figure, plt, float("nan"))

    def test_the_outline_keeps_extremes(self):
        time = np.arange(100_007) * 1e-5
        values = np.sin(300 * time)
        values[[5, 77_777, 100_006]] = 3.0, -4.0, 5.0
        x, y = outline(time, values)
        self.assertLessEqual(len(x), 2100)
        self.assertEqual((y.min(), y[x < 1e-3].max(), y[-1]), (-4.0, 3.0, 5.0))
        self.assertTrue(np.all(np.diff(x) >= 0))
        np.testing.assert_array_equal(outline(time[:100], values[:100])[1], values[:100])
        self.assertTrue(np.isnan(outline(time, np.full_like(time, np.nan))[1]).all())


if __name__ == "__main__":
    unittest.main()
