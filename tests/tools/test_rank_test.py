"""Statistics of tools/bench/compare against published tables and examples, and what they promise by simulation."""
import math
import pathlib
import sys
import unittest

import numpy

sys.path.insert(0, str(pathlib.Path(__file__).resolve().parents[2] / "tools" / "bench"))
import rank_test  # noqa: E402

# Hollander and Wolfe, 1999, example 4.1 (permeability of the chorioamnion; at term, and at 12 to 26 weeks); one-sided
# p = 0.1272 for W = 35 in the reference manual of R's wilcox.test, which works the same example (from memory).
TERM = [0.80, 0.83, 1.89, 1.04, 1.45, 1.38, 1.91, 1.64, 0.73, 1.46]
EARLY = [1.15, 0.88, 0.90, 0.74, 1.21]
# Critical values of U, two-sided 5 %, from the usual tables (D. Auble, 1953; reprinted in S. Siegel, "Nonparametric
# Statistics", 1956, table K; from memory).
TABLE = {(5, 5): 2, (6, 6): 5, (7, 7): 8, (8, 8): 13, (9, 9): 17, (10, 10): 23, (12, 12): 37, (15, 15): 64, (20, 20): 127}


class RankTest(unittest.TestCase):
    def test_p_value_equals_the_published_example(self):
        self.assertAlmostEqual(rank_test.p_value(EARLY, TERM), 2 * 0.1272, delta=1e-4)  # four digits printed, doubled

    def test_critical_values_equal_the_published_table(self):
        for (m, n), u in TABLE.items():
            self.assertEqual(rank_test.critical_u(m, n, 0.05), u, (m, n))

    def test_null_distribution_is_scipys(self):
        # U of two samples that are apart by exactly u pairs: SciPy's exact two-sided p against the sum of shares here.
        shares = rank_test.share_of_u(5, 7)
        self.assertAlmostEqual(sum(shares), 1.0, places=12)
        a = [10.0 * k for k in range(1, 6)]
        for u in (0, 3, 9):
            b = self.sample_with_u(a, 7, u)
            self.assertAlmostEqual(rank_test.p_value(a, b), min(1.0, 2 * sum(shares[: u + 1])), places=12)

    @staticmethod
    def sample_with_u(a, n, u):
        """n values, none of a's, with b_j < a_i for exactly u pairs."""
        b = []
        for j in range(n):
            below = min(u, len(a))
            u -= below
            b.append((a[len(a) - below] - 5.0 if below else a[-1] + 5.0) + 0.1 * j)
        return b

    def test_the_smallest_p_is_that_of_samples_apart(self):
        self.assertAlmostEqual(rank_test.p_value([1, 2, 3, 4, 5], [6, 7, 8, 9]), rank_test.smallest_p(5, 4), places=12)

    def test_interval_turns_the_test_around(self):
        # Just inside its ends the test does not object, just outside it does: the definition, at numbers without ties.
        dice = numpy.random.default_rng(1)
        a, b = dice.lognormal(0, 0.1, 12), dice.lognormal(0.1, 0.1, 12)
        ratio, low, high = rank_test.ratio_interval(a, b)
        self.assertTrue(low < ratio < high)
        for end, outwards in ((low, 1 - 1e-9), (high, 1 + 1e-9)):
            self.assertLessEqual(rank_test.p_value(a, b / (end * outwards)), 0.05)
            self.assertGreater(rank_test.p_value(a, b / (end / outwards)), 0.05)

    def test_interval_covers_as_often_as_it_says(self):
        dice, runs, covered = numpy.random.default_rng(2), 1000, 0
        for _ in range(runs):
            a, b = dice.lognormal(3, 0.2, 10), 1.1 * dice.lognormal(3, 0.2, 10)
            _, low, high = rank_test.ratio_interval(a, b)
            covered += low <= 1.1 <= high
        # Exact share for n = 10: 1 - 2 P(U <= 23) = 0.957; four standard deviations of a binomial of 1000: 0.026.
        self.assertAlmostEqual(covered / runs, 1 - 2 * sum(rank_test.share_of_u(10, 10)[:24]), delta=0.026)

    def test_holm_equals_the_worked_example(self):
        # Step-down by hand: 0.01 x 4, 0.02 x 3, max(0.06, 0.03 x 2), max(0.06, 0.04 x 1)
        for got, wanted in zip(rank_test.holm([0.03, 0.01, 0.04, 0.02]), [0.06, 0.04, 0.06, 0.06]):
            self.assertAlmostEqual(got, wanted, places=12)

    def test_few_values_give_no_interval(self):
        self.assertEqual(rank_test.ratio_interval([1.0, 2.0], [1.5, 2.5])[1:], (0.0, math.inf))


class Judge(unittest.TestCase):
    """Times as launches give them here: a spread of 3 %, and one launch in eight disturbed by up to a half."""

    @staticmethod
    def times(dice, rounds=12):
        quiet = 100.0 * dice.lognormal(0, 0.03, rounds)
        return list(quiet * numpy.where(dice.random(rounds) < 0.125, 1 + 0.5 * dice.random(rounds), 1.0))

    def test_ten_percent_added_to_one_of_thirty_is_found_and_nothing_else(self):
        dice = numpy.random.default_rng(3)
        base = {f"b{k}": self.times(dice) for k in range(30)}
        new = {f"b{k}": self.times(dice) for k in range(30)}
        new["b7"] = [1.1 * t for t in new["b7"]]
        new["b9"] = [t / 1.15 for t in new["b9"]]
        found = {v.name: v.verdict for v in rank_test.judge(base, new) if v.verdict != "same"}
        self.assertEqual(found, {"b7": "slower", "b9": "faster"})

    def test_false_alarms_stay_below_alpha(self):
        # Nothing differs, and the threshold is off: at most 5 % of sets of ten may alarm; four standard deviations of a
        # binomial of 300 above that: 0.05.
        dice, sets = numpy.random.default_rng(4), 300
        alarms = 0
        for _ in range(sets):
            base = {f"b{k}": self.times(dice) for k in range(10)}
            new = {f"b{k}": self.times(dice) for k in range(10)}
            alarms += any(v.verdict != "same" for v in rank_test.judge(base, new, threshold=0.0, alpha=0.05))
        self.assertLess(alarms / sets, 0.05 + 0.05)

    def test_a_small_but_sure_difference_is_no_alarm(self):
        base = {"b": [100.0 + 0.01 * k for k in range(12)]}
        verdict = rank_test.judge(base, {"b": [1.02 * t + 0.001 for t in base["b"]]})[0]
        self.assertEqual(verdict.verdict, "same")
        self.assertLess(verdict.p, 1e-5)
        self.assertAlmostEqual(verdict.ratio, 1.02, delta=1e-3)  # 0.001 added, 0.11 % of spread

    def test_only_what_both_sides_have_is_judged(self):
        times = [1.0, 2.0, 3.0, 4.0]
        self.assertEqual([v.name for v in rank_test.judge({"a": times, "b": times}, {"b": times, "c": times})], ["b"])


if __name__ == "__main__":
    unittest.main()
