// A unit that breaks the lanes' symbol rule on purpose (a weak template beside its entry): the check must refuse it.
template <class T>
[[gnu::noinline]] T twice(T x) {
  return x + x;
}
extern "C" double slipbench_lanes_control(double x) { return twice(x); }
