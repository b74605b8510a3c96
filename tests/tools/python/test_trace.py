"""Traces as the command writes them, against the standard library's reading of the same CSV."""
import unittest

import h5py
import numpy as np
from command import CONVEYOR, MAINS, Folder, read_csv, run

from slipbench_client import ClientError, Column, Trace, TraceError, VersionError, read_trace, unit_of


def bits(array):
    """Bytes, NaN in one form."""
    return np.where(np.isnan(array), np.nan, array).tobytes()


class Traces(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.folder = Folder(cls).path
        cls.files = {}
        for name, scenario in (("mains", MAINS), ("conveyor", CONVEYOR)):
            for ending in ("csv", "h5"):
                cls.files[name, ending] = cls.folder / f"{name}.{ending}"
                run("run", scenario, "--set", "run.duration_s=1", "--set", "score.from_s=0.1", "--set", "score.to_s=1",
                    "--quiet", "--trace", cls.files[name, ending])

    @classmethod
    def addCleanup(cls, *arguments):
        cls.addClassCleanup(*arguments)

    def write(self, name, text):
        path = self.folder / name
        path.write_text(text)
        return path

    def test_csv_is_what_the_file_says(self):
        for name in ("mains", "conveyor"):
            path = self.files[name, "csv"]
            trace, columns = read_trace(path), read_csv(path)
            self.assertEqual(trace.names, tuple(columns))
            self.assertEqual(trace.rows, 1001)
            for column, values in columns.items():
                self.assertEqual(bits(trace[column]), values.tobytes(), column)
        self.assertTrue(np.isnan(read_trace(self.files["mains", "csv"])["speed_reference_rpm"]).all())

    def test_hdf5_equals_csv(self):
        for name in ("mains", "conveyor"):
            csv, h5 = (read_trace(self.files[name, ending]) for ending in ("csv", "h5"))
            self.assertEqual(h5.names, csv.names)
            for column in csv:
                self.assertEqual(bits(h5[column]), bits(csv[column]), column)
                self.assertEqual(h5.unit(column), csv.unit(column), column)
                self.assertTrue(h5.meaning(column), column)
        with h5py.File(self.files["mains", "h5"]) as file, h5py.File(self.folder / "copy.h5", "w") as copy:
            for name in file:  # as a tool does that keeps no order
                file.copy(name, copy)
        self.assertEqual(read_trace(self.folder / "copy.h5").names, tuple(sorted(read_trace(self.files["mains", "csv"]))))
        self.assertEqual((h5.about["seed"], h5.about["title"]), (20, "Conveyor with a hot rotor"))
        self.assertEqual(h5.about["scenario"], CONVEYOR.read_text())
        self.assertIn("Conveyor with a hot rotor", repr(h5))

    def test_a_unit_is_the_names_last_word(self):
        named = {"time_s": "s", "torque_Nm": "N m", "ekf.trust": "", "rpm": "", "ekf.rotor_flux_angle_rad": "rad", "x_y": ""}
        self.assertEqual({name: unit_of(name) for name in named}, named)

    def test_attributes_groups_and_estimators(self):
        trace = read_trace(self.files["conveyor", "csv"])
        self.assertEqual(trace.estimators, ("luenberger", "reduced", "ekf"))
        self.assertIs(trace.speed_rpm, trace["speed_rpm"])
        self.assertIs(trace.ekf.speed_rpm, trace["ekf.speed_rpm"])
        self.assertEqual(trace.group("ekf").names, ("speed_rpm", "rotor_flux_Wb", "rotor_flux_angle_rad", "torque_Nm", "trust"))
        self.assertIn("ekf", dir(trace))
        self.assertEqual(len(trace), len(trace.columns))

    def test_between_includes_its_ends_and_copies_nothing(self):
        trace = read_trace(self.files["conveyor", "csv"])
        for first, last in ((0, 1000), (1, 300), (7, 7), (333, 999)):
            part = trace.between(first * 1e-3, last / 1000)
            self.assertEqual(part.rows, last - first + 1, (first, last))
            self.assertEqual(part.time_s[0], trace.time_s[first])
            self.assertTrue(np.shares_memory(part.speed_rpm, trace.speed_rpm))
        self.assertEqual(trace.between(5.0, 6.0).rows, 0)
        self.assertRaises(ValueError, trace.between, 1.0, 0.5)

    def test_tables(self):
        trace = read_trace(self.files["conveyor", "csv"])
        names = ["i_a_A", "time_s"]
        table, structured = trace.array(names), trace.structured(names)
        self.assertEqual((table.shape, structured.shape, structured.dtype.names), ((1001, 2), (1001,), ("i_a_A", "time_s")))
        for k, name in enumerate(names):
            self.assertEqual(table[:, k].tobytes(), trace[name].tobytes())
            self.assertEqual(structured[name].tobytes(), trace[name].tobytes())
        self.assertEqual(trace.array().shape, (1001, len(trace)))

    def test_an_unknown_column_names_the_nearest(self):
        trace = read_trace(self.files["conveyor", "csv"])
        with self.assertRaisesRegex(KeyError, "no column 'sped_rpm': did you mean speed_rpm"):
            trace["sped_rpm"]
        with self.assertRaisesRegex(AttributeError, "did you mean torque_Nm"):
            trace.torque_nm
        self.assertNotIn("x", trace)
        self.assertIsNone(trace.get("x"))

    def test_what_is_no_trace_is_told(self):
        text = "time_s,speed_rpm\n0,1\n0.001,2\n"
        self.assertEqual(read_trace(self.write("good.csv", text)).speed_rpm.tolist(), [1.0, 2.0])
        self.assertEqual(read_trace(self.write("head.csv", "time_s,speed_rpm\n")).rows, 0)
        for name, content, sentence in (
                ("short.csv", text + "0.002\n", r"short.csv:4: 1 values for 2 columns"),
                ("word.csv", text.replace("2\n", "two\n"), r"word.csv:3: value 2 is 'two'"),
                ("other.csv", "a,b\n1,2\n", r"begins with 'a'"),
                ("empty.csv", "", r"begins with ''"),
                ("twice.csv", "time_s,x,x\n0,1,2\n", r"'x' is there twice")):
            with self.subTest(name), self.assertRaisesRegex(TraceError, sentence):
                read_trace(self.write(name, content))
        with self.assertRaisesRegex(TraceError, "none.csv: No such file"):
            read_trace(self.folder / "none.csv")
        (self.folder / "bytes.csv").write_bytes(bytes(range(256)))
        with self.assertRaisesRegex(TraceError, "neither CSV nor HDF5"):
            read_trace(self.folder / "bytes.csv")

    def test_broken_hdf5_is_told(self):
        whole = self.files["mains", "h5"].read_bytes()
        (self.folder / "cut.h5").write_bytes(whole[:len(whole) // 2])
        self.assertRaisesRegex(TraceError, "cut.h5: HDF5 cannot read it", read_trace, self.folder / "cut.h5")
        with h5py.File(self.folder / "foreign.h5", "w") as file:
            file["x"] = [1.0]
        self.assertRaisesRegex(TraceError, "no trace", read_trace, self.folder / "foreign.h5")
        (self.folder / "later.h5").write_bytes(whole)
        with h5py.File(self.folder / "later.h5", "a") as file:
            file["about"].attrs["format"] = 2
        self.assertRaisesRegex(VersionError, "format is 2, known here is 1", read_trace, self.folder / "later.h5")

    def test_arrays_must_fit(self):
        self.assertRaises(TraceError, Trace, [Column("a")], [])
        self.assertRaises(TraceError, Trace, [Column("a"), Column("b")], [np.zeros(2), np.zeros(3)])
        self.assertTrue(issubclass(TraceError, ClientError))


if __name__ == "__main__":
    unittest.main()
