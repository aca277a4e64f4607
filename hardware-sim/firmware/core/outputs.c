/*
 * The outputs: who owns each, its limits, and when it changes next. Falls are set up ahead in the
 * timer (falls.c); this file keeps the books. It is long because it is one thing: owner, limits, pin
 * and next change of an output change together, and nowhere else.
 *
 * `bank_service` runs in the timer's interrupt, with interrupts on, or in the main loop. Whoever
 * runs it has `bank_held` set; an interrupt that finds it set leaves `bank_wanted` and goes.
 *
 * A permit is a bit in a register for each output that may rise at once: configured, not owned, its
 * least gap over. Whoever raises an output takes the permit in the same breath, so that two never
 * do. A permit is given only while no hit waits to be booked.
 */
#include "board.h"

#define NEVER UINT32_MAX
#define LOOK_AGAIN_US 8000  /* the service comes that often, */
#define FALL_REACH_US 15000 /* to set up falls that are so near: half of what 16 bits reach, less a bit */
/* The service comes this long before a rise and waits for it, so that it is not late by its own work; */
#define EARLY_US 200
/* and then begins with this much to go, which the checks before it take at least. */
#define FIRST_RISE_TAKES_US 50
#define NEXT_RISE_TAKES_US 12

output_t outputs[N_OUTPUTS];
static mask_t active; /* outputs that are owned: the others have nothing due */
volatile uint8_t bank_held __attribute__((used)), bank_wanted __attribute__((used));

static inline bool owned(const output_t *line) { return line->flags & (COMMAND | SYNC); }

/* ---- Limits */

uint8_t output_shape_reason(const output_t *line, const shape_t *shape) {
  if (line->longest_on_us == 0) return R_NOT_CONFIGURED;
  if (shape->width_us == 0 || shape->repeats == 0) return R_BAD_SHAPE;
  if (shape->repeats > 1 && shape->period_us <= shape->width_us) return R_BAD_SHAPE;
  if (shape->width_us > line->longest_on_us) return R_LONGEST_ON;
  if (shape->repeats > 1 && shape->period_us - shape->width_us < line->least_gap_us) {
    return R_LEAST_GAP;
  }
  return R_NONE;
}

static bool gap_over(const output_t *line, uint32_t now_us) {
  return !(line->flags & FELL) || now_us - line->fall_us >= line->least_gap_us;
}

static bool far_enough(const output_t *line, int32_t count) {
  if (!(line->flags & ROSE)) return true;
  uint32_t apart = (uint32_t)count - (uint32_t)line->first_rise_count;
  if ((int32_t)apart < 0) apart = 0 - apart;
  return apart >= line->least_counts;
}

static bool allowed(const output_t *line, const shape_t *shape) {
  if (shape->repeats > line->allowance_rises) return false;
  /* width * repeats in 48 bits, from two products of 32. */
  uint32_t low = (uint32_t)(uint16_t)shape->width_us * shape->repeats;
  uint32_t high = (uint32_t)(uint16_t)(shape->width_us >> 16) * shape->repeats + (low >> 16);
  return high <= 0xffff && (high << 16 | (uint16_t)low) <= line->allowance_us;
}

static uint8_t rise_reason(const output_t *line, const shape_t *shape, uint32_t us, int32_t count) {
  uint8_t reason = output_shape_reason(line, shape);
  if (reason) return reason;
  if (owned(line)) return R_BUSY;
  if (!gap_over(line, us)) return R_LEAST_GAP;
  if (!far_enough(line, count)) return R_LEAST_COUNTS;
  return allowed(line, shape) ? R_NONE : R_ALLOWANCE;
}

/* Would this slot pass every check that time does not change? */
bool output_slot_fast(int32_t target, const order_t *order) {
  const output_t *line = &outputs[order->output];
  return output_shape_reason(line, &order->shape) == R_NONE && far_enough(line, target) &&
         allowed(line, &order->shape);
}

/* ---- The pin */

/* Before anything of an output changes: nobody raises it, and who did is known. */
static void withdraw_permit(uint8_t n) {
  hal_irq_off();
  hal_permits &= (mask_t)~BIT(n);
  hal_irq_on();
  slots_take_hits();
}

/* Gives the fall of an output that rose at `ticks` to the timer at once, if its 16 bits reach so far. */
static void set_fall(uint8_t n, uint16_t ticks, uint32_t width_us) {
  if (width_us > FALL_REACH_US) return;
  falls_add(n, (uint16_t)(ticks + ((uint16_t)width_us << 1) - HAL_FALL_TICKS));
}

/* False: the interrupt has just raised it for a slot that is not booked yet. */
static bool raise_pin(uint8_t n, uint32_t width_us, uint32_t *us) {
  hal_irq_off();
  if (hal_outputs_on() & BIT(n)) {
    hal_irq_on();
    return false;
  }
  hal_permits &= (mask_t)~BIT(n);
  hal_out_on(BIT(n));
  uint16_t ticks = hal_ticks();
  hal_irq_on();
  set_fall(n, ticks, width_us);
  *us = hal_extend_ticks(ticks);
  return true;
}

/* The 1 kHz tick cuts the output by itself when this runs out; a little over, so that it comes last. */
static void set_cut(uint8_t n, uint32_t longest_us) {
  cut_ms_t ms = (longest_us >> 10) + (longest_us >> 15) + 3;
  hal_irq_off();
  hal_cut_ms[n] = ms;
  hal_irq_on();
}

static void turned_on(uint8_t n, uint32_t us, uint32_t cut_us) {
  output_t *line = &outputs[n];
  line->flags |= ON;
  line->rise_us = us;
  line->span_us = cut_us;
  set_cut(n, cut_us);
}

/* ---- Rises */

static void book_rise(uint8_t n, uint32_t us) {
  output_t *line = &outputs[n];
  line->left--;
  line->allowance_rises--;
  line->allowance_us -= line->width_us;
  line->flags |= TAKEN;
  turned_on(n, us, line->longest_on_us);
}

/* The first rise of a command, at `us` and `count`: it owns the output from here on. */
static inline __attribute__((always_inline)) void output_begin(uint8_t n, uint32_t id,
    const shape_t *shape, uint32_t us, int32_t count) {
  output_t *line = &outputs[n];
  line->flags |= COMMAND | ROSE;
  active |= BIT(n);
  line->ending = R_NONE;
  line->own.command.id = id;
  line->own.command.on_us = 0;
  line->own.command.period_us = shape->period_us;
  line->width_us = shape->width_us;
  line->left = shape->repeats;
  line->late_us = 0;
  line->first_rise_count = count;
  book_rise(n, us);
  voice_outcome(id, FIRED, R_NONE, n, us, count, 0);
}

static int32_t count_now(void) {
  hal_irq_off();
  int32_t count = hal_count();
  hal_irq_on();
  return count;
}

/* Raises what passed every check at `us` and `count`, or refuses it. */
static inline __attribute__((always_inline)) void rise_or_refuse(uint32_t id, uint8_t n,
    const shape_t *shape, uint8_t reason, uint32_t us, int32_t count) {
  if (reason == R_NONE && !raise_pin(n, shape->width_us, &us)) reason = R_BUSY;
  if (reason != R_NONE) voice_outcome(id, REFUSED, reason, n, us, count, 0);
  else output_begin(n, id, shape, us, count);
}

/* A command's first rise, whose start has come or will within microseconds, or why not. */
void bank_rise(uint32_t id, uint8_t n, const shape_t *shape, const window_t *window) {
  uint32_t us = hal_now_us();
  int32_t count = count_now();
  uint32_t early_us = window->start_us - us;
  if ((window->flags & START_AT) && early_us <= FIRST_RISE_TAKES_US) us = window->start_us;
  bool outside = (window->flags & COUNT_WINDOW) &&
                 ((int32_t)((uint32_t)count - (uint32_t)window->count_from) < 0 ||
                  (int32_t)((uint32_t)window->count_to - (uint32_t)count) < 0);
  uint8_t reason = outside ? R_COUNT_WINDOW : rise_reason(&outputs[n], shape, us, count);
  rise_or_refuse(id, n, shape, reason, us, count);
}

/* A slot that the count has come to: the interrupt has raised it, or left the question to us. */
void bank_rise_hit(const slot_t *slot, const order_t *order) {
  uint8_t n = order->output;
  if (slot->rose) set_fall(n, slot->hit_ticks, order->shape.width_us);
  uint32_t us = hal_extend_ticks(slot->hit_ticks);
  if (slot->rose) {
    output_begin(n, order->id, &order->shape, us, slot->target);
  } else {
    uint8_t reason = rise_reason(&outputs[n], &order->shape, us, slot->target);
    rise_or_refuse(order->id, n, &order->shape, reason, us, slot->target);
  }
}

/* Inlined where it is called from, since the stack is short. */
static inline __attribute__((always_inline)) void done(uint8_t n, uint8_t reason, uint32_t us,
                                                       int32_t count) {
  output_t *line = &outputs[n];
  line->flags &= (uint8_t)~COMMAND;
  active &= (mask_t)~BIT(n);
  line->left = 0;
  voice_outcome(line->own.command.id, DONE, reason, n, us, count, line->own.command.on_us);
}

/* The next rise of a train that is due, or its end. */
static void rise_again(uint8_t n) {
  output_t *line = &outputs[n];
  uint32_t us = hal_now_us();
  if (line->flags & SYNC) {
    raise_pin(n, line->width_us, &us); /* it is owned: no slot has raised it */
    turned_on(n, us, line->width_us);
    voice_edge(SYNC_EDGE | n, 1, us, count_now());
    return;
  }
  uint32_t due_us = line->rise_us + line->own.command.period_us - line->late_us;
  uint8_t reason = R_NONE;
  if (line->longest_on_us == 0) reason = R_NOT_CONFIGURED;
  else if (line->width_us > line->longest_on_us) reason = R_LONGEST_ON;
  else if (!gap_over(line, due_us + line->late_us)) reason = R_LEAST_GAP;
  else if (line->allowance_rises < 1 || line->width_us > line->allowance_us) reason = R_ALLOWANCE;
  if (reason) {
    done(n, reason, hal_now_us(), count_now());
    return;
  }
  raise_pin(n, line->width_us, &us);
  line->late_us = (int32_t)(us - due_us) > 0 ? (uint16_t)(us - due_us) : 0;
  book_rise(n, us);
}

/* ---- Falls */

/* The pin went idle at `us`. */
static void fell(uint8_t n, uint32_t us) {
  output_t *line = &outputs[n];
  uint32_t took_us = us - line->rise_us;
  line->flags = (uint8_t)((line->flags & ~ON) | FELL);
  line->fall_us = us;
  set_cut(n, 0);
  if (line->flags & SYNC) {
    uint32_t x = xorshift32(&line->own.sync.random);
    line->rise_us = us;
    line->span_us = scaled(x, line->own.sync.least_wait_us, line->own.sync.most_wait_us);
    voice_edge(SYNC_EDGE | n, 0, us, count_now());
    return;
  }
  if (took_us >= line->span_us && line->span_us < line->width_us && line->ending == R_NONE) {
    line->ending = R_LONGEST_ON;
    line->left = 0;
  }
  line->own.command.on_us += took_us;
  if ((line->flags & TAKEN) && took_us < line->width_us) {
    line->allowance_us += line->width_us - took_us;
  }
  line->flags &= (uint8_t)~TAKEN;
  if (line->left == 0) done(n, line->ending, us, count_now());
}

static void fall(uint8_t n) {
  hal_irq_off();
  hal_out_idle(BIT(n));
  uint16_t ticks = hal_ticks();
  hal_irq_on();
  falls_cancel(n);
  fell(n, hal_extend_ticks(ticks));
}

/* Falls that the timer has made, and those that the tick's own cut-off has. */
static void book_falls(void) {
  uint16_t ticks;
  for (mask_t made; (made = falls_take(&ticks)) != 0;) {
    uint32_t us = hal_extend_ticks(ticks);
    for (uint8_t n = 0; made; n++, made >>= 1) {
      if ((made & 1) && (outputs[n].flags & ON)) fell(n, us);
    }
  }
  if (!hal_cut) return;
  hal_irq_off();
  mask_t cut = hal_cut;
  hal_cut = 0;
  hal_irq_on();
  for (uint8_t n = 0; cut; n++, cut >>= 1) {
    output_t *line = &outputs[n];
    if (!(cut & 1) || !(line->flags & ON)) continue;
    if (line->ending == R_NONE) line->ending = R_LONGEST_ON;
    line->left = 0;
    fall(n);
  }
}

/* ---- Ends */

/* Ends whatever owns the output, now. */
void bank_stop(uint8_t n, uint8_t reason) {
  output_t *line = &outputs[n];
  bool command = line->flags & COMMAND;
  if (command) {
    line->ending = reason;
    line->left = 0;
  }
  if (line->flags & ON) fall(n);
  else if (command) done(n, reason, hal_now_us(), count_now());
  line->flags &= (uint8_t)~SYNC;
  active &= (mask_t)~BIT(n);
}

static void end_unrisen(uint16_t mask, uint8_t reason) {
  slots_end(0, mask, reason);
  waiting_end(mask, reason);
}

void bank_end_all(uint16_t mask, uint8_t reason) {
  end_unrisen(mask, reason);
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    if ((mask & 1u << n) && owned(&outputs[n])) bank_stop(n, reason);
  }
}

/* Ends what a silent or replaced host asked for, but for pulses that may finish. */
void bank_end_for_silence(uint8_t reason) {
  end_unrisen(0xffff, reason);
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    output_t *line = &outputs[n];
    if (!(line->flags & COMMAND)) continue;
    if ((line->flags & (ON | FINISH)) != (ON | FINISH)) {
      bank_stop(n, reason);
    } else if (line->left > 0) {
      line->ending = reason;
      line->left = 0;
    }
  }
}

/* ---- Orders */

void output_configure(const configure_t *message) {
  uint8_t n = message->output;
  if (n >= N_OUTPUTS) return;
  output_t *line = &outputs[n];
  bool high = message->flags & IDLE_HIGH;
  withdraw_permit(n);
  bool ends = high != hal_idles_high(BIT(n)) || message->longest_on_us == 0;
  if ((line->flags & SYNC) && (line->width_us > message->longest_on_us ||
                               line->own.sync.least_wait_us < message->least_gap_us)) {
    ends = true;
  }
  if (ends && owned(line)) bank_stop(n, R_CUT);
  hal_irq_off();
  hal_set_idle(BIT(n), high);
  hal_irq_on();
  line->flags &= (uint8_t)~(FINISH | TAKEN);
  if (message->flags & FINISH_ON_SILENCE) line->flags |= FINISH;
  line->longest_on_us = message->longest_on_us;
  line->least_gap_us = message->least_gap_us;
  line->least_counts = message->least_counts;
  line->allowance_us = message->allowance_us;
  line->allowance_rises = message->allowance_rises;
  if (line->flags & ON) {
    line->span_us = line->longest_on_us;
    set_cut(n, line->span_us);
    falls_cancel(n); /* the service, which comes next, sets it up anew */
  }
}

/* Every output back to "never", but for its idle level; a pulse on its way keeps its cut-off. */
void bank_unconfigure(void) {
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    withdraw_permit(n);
    output_t *line = &outputs[n];
    line->longest_on_us = 0;
    line->allowance_us = 0;
    line->allowance_rises = 0;
    line->flags &= (uint8_t)~TAKEN;
  }
}

void output_sync(const sync_t *message) {
  uint8_t n = message->output;
  output_t *line = n < N_OUTPUTS ? &outputs[n] : 0;
  if (line) {
    withdraw_permit(n);
    if (line->flags & SYNC) bank_stop(n, R_CUT);
  }
  if (message->running == 0) return;
  uint32_t least = message->least_gap_us, most = message->most_gap_us;
  if (!line || owned(line) || message->width_us < 1 || message->width_us > line->longest_on_us ||
      least < 1 || least < line->least_gap_us || most < least || (int32_t)most < 0) {
    voice_fault(F_SYNC_REFUSED, n);
    return;
  }
  line->flags |= SYNC;
  active |= BIT(n);
  line->width_us = message->width_us;
  line->own.sync.random = message->seed ? message->seed : 1;
  line->own.sync.least_wait_us = least;
  line->own.sync.most_wait_us = most;
  line->rise_us = hal_now_us();
  line->span_us = scaled(xorshift32(&line->own.sync.random), least, most);
}

/* Once a second: a fall an hour and more ago would come round again on a 32-bit clock. */
void bank_forget_old_falls(void) {
  uint32_t now_us = hal_now_us();
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    output_t *line = &outputs[n];
    if (now_us - line->fall_us > 0xffd00000) line->flags &= (uint8_t)~FELL;
  }
}

/* ---- The service */

/* Microseconds until an active output changes by itself; 0: it is due. */
static uint32_t due_in(const output_t *line, uint32_t now_us) {
  uint32_t limit_us = line->span_us;
  if (line->flags & ON) {
    if (line->width_us < limit_us) limit_us = line->width_us;
  } else if (line->flags & COMMAND) {
    limit_us = line->own.command.period_us - line->late_us;
  }
  uint32_t elapsed_us = now_us - line->rise_us;
  return elapsed_us >= limit_us ? 0 : limit_us - elapsed_us;
}

/* @returns microseconds until a least gap is over that an armed slot may wait for */
static uint32_t give_permits(uint32_t now_us) {
  uint32_t next_us = NEVER;
  mask_t armed = slots_armed_outputs() & (mask_t)~hal_permits;
  for (uint8_t n = 0; armed; n++, armed >>= 1) {
    output_t *line = &outputs[n];
    if (!(armed & 1) || line->longest_on_us == 0 || owned(line)) continue;
    if (!gap_over(line, now_us)) {
      uint32_t left_us = line->least_gap_us - (now_us - line->fall_us);
      if (left_us < next_us) next_us = left_us;
      continue;
    }
    slots_refresh_fast(n);
    hal_irq_off();
    if (!slots_hit_waiting()) hal_permits |= BIT(n);
    hal_irq_on();
  }
  return next_us;
}

/* Falls before rises, trains before waiting pulses: WIRE.md, rule 23. */
static void run_due(void) {
  uint32_t now_us = hal_now_us();
  mask_t left = active & (mask_t)~falls_known; /* the timer sees to the others */
  for (uint8_t n = 0; left; n++, left >>= 1) {
    if ((left & 1) && (outputs[n].flags & ON) && due_in(&outputs[n], now_us) == 0) fall(n);
  }
  left = active & (mask_t)~falls_known;
  for (uint8_t n = 0; left; n++, left >>= 1) {
    if (!(left & 1) || (outputs[n].flags & ON)) continue;
    if (due_in(&outputs[n], now_us) <= NEXT_RISE_TAKES_US) rise_again(n);
  }
  while (waiting_rise_due(now_us + FIRST_RISE_TAKES_US)) continue;
}

/* Falls that were too far ahead when their outputs rose. */
static void __attribute__((noinline)) set_falls(void) {
  mask_t left = active & (mask_t)~falls_known;
  if (!left) return;
  uint32_t now_us = hal_now_us();
  for (uint8_t n = 0; left; n++, left >>= 1) {
    if (!(left & 1) || !(outputs[n].flags & ON)) continue;
    uint32_t due_us = due_in(&outputs[n], now_us);
    if (due_us > FALL_REACH_US) continue;
    falls_add(n, ((uint16_t)(now_us + due_us) << 1) - HAL_FALL_TICKS);
  }
}

/* For whoever holds the bank: he lets go of it after, unless it is wanted again. */
void bank_service(void) {
  for (;;) {
    slots_take_hits();
    bank_wanted = 0;
    book_falls();
    run_due();
    set_falls();
    uint32_t now_us = hal_now_us();
    uint32_t rise_us = waiting_next_us(now_us), wake_us = give_permits(now_us);
    rise_us = rise_us > FIRST_RISE_TAKES_US ? rise_us - FIRST_RISE_TAKES_US : 0;
    if (wake_us > LOOK_AGAIN_US) wake_us = LOOK_AGAIN_US;
    mask_t left = active & (mask_t)~falls_known;
    for (uint8_t n = 0; left; n++, left >>= 1) {
      if (!(left & 1) || (outputs[n].flags & ON)) continue;
      uint32_t due_us = due_in(&outputs[n], now_us);
      due_us = due_us > NEXT_RISE_TAKES_US ? due_us - NEXT_RISE_TAKES_US : 0;
      if (due_us < rise_us) rise_us = due_us;
    }
    if (rise_us <= EARLY_US && rise_us < wake_us) {
      uint32_t until_us = now_us + rise_us;
      while ((int32_t)(until_us - hal_now_us()) > 0 && !bank_wanted && !slots_hit_waiting()) hal_wait();
      continue;
    }
    if (rise_us < wake_us) wake_us = rise_us - EARLY_US;
    uint16_t ticks = (uint16_t)(now_us + wake_us) << 1;
    hal_irq_off();
    bool again = bank_wanted || slots_hit_waiting();
    if (!again) falls_wake(ticks);
    hal_irq_on();
    if (!again) return;
  }
}

/* For the main loop: outputs, slots and outcomes are its own until it releases them. */
void bank_hold(void) {
  bank_held = 1;
  hal_barrier();
}

void bank_release(void) {
  bank_service();
  bank_release_unchanged();
}

/* The same where nothing was changed that the service would have to look at. */
void bank_release_unchanged(void) {
  for (;;) {
    hal_irq_off();
    if (!bank_wanted && !slots_hit_waiting()) break;
    hal_irq_on();
    bank_service();
  }
  bank_held = 0;
  hal_irq_on();
}
