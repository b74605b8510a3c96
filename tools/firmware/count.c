/* Counts the instructions of an exported step over its test vectors, and compares every answer and state to the bit.
 * Built with -DVECTORS='"NAME_vectors.h"'. Prints "least MIN most MAX sum SUM ticks N"; status 0, or 1 where a bit differs. */
#include <string.h>

#include VECTORS
#include "semihosting.h"
#include "timer.h"

typedef void step_function(vectors_state *, const vectors_in *, vectors_out *);

/* One instruction: what a call costs beside the step. */
__attribute__((naked, noinline)) static void nothing(vectors_state *state, const vectors_in *in, vectors_out *out) {
  (void)state, (void)in, (void)out;
  __asm volatile("bx lr");
}

/* Instructions around and in one call. */
__attribute__((noinline)) static uint32_t timed(step_function *step, vectors_state *state, const vectors_in *in,
                                                vectors_out *out) {
  const uint32_t before = timer_value();
  step(state, in, out);
  return instructions_of(before - timer_value());
}

static int differ(const char *what, unsigned stretch, unsigned tick) {
  semihosting_print("differs: ");
  semihosting_print(what);
  semihosting_print(", stretch ");
  semihosting_print_unsigned(stretch);
  semihosting_print(", tick ");
  semihosting_print_unsigned(tick);
  semihosting_print("\n");
  return 1;
}

static vectors_state state;
static vectors_out out;

int main(void) {
  step_function *volatile step = VECTORS_STEP;
  step_function *volatile idle = nothing;
  uint32_t least = 0xFFFFFFFFu, most = 0, sum = 0;
  unsigned stretch, tick;
  (void)vectors_state_names, (void)vectors_out_names;
  timer_start();
  VECTORS_INIT(&state);
  if (memcmp(&state, &vectors_starts[0], sizeof state) != 0) return differ("first state", 0, 0);
  for (stretch = 0; stretch < VECTORS_STRETCHES; ++stretch) {
    state = vectors_starts[stretch];
    for (tick = 0; tick < VECTORS_TICKS; ++tick) {
      const uint32_t around = timed(idle, &state, &vectors_seen[stretch][tick], &out) - 1u;
      const uint32_t count = timed(step, &state, &vectors_seen[stretch][tick], &out) - around;
      if (memcmp(&out, &vectors_expected[stretch][tick], sizeof out) != 0) return differ("answer", stretch, tick);
      least = count < least ? count : least;
      most = count > most ? count : most;
      sum += count;
    }
    if (memcmp(&state, &vectors_ends[stretch], sizeof state) != 0) return differ("state", stretch, tick);
  }
  semihosting_print("least ");
  semihosting_print_unsigned(least);
  semihosting_print(" most ");
  semihosting_print_unsigned(most);
  semihosting_print(" sum ");
  semihosting_print_unsigned(sum);
  semihosting_print(" ticks ");
  semihosting_print_unsigned((unsigned long)VECTORS_STRETCHES * VECTORS_TICKS);
  semihosting_print("\n");
  return 0;
}
