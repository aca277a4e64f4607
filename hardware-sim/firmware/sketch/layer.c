/*
 * The core over the hobby platform's own functions, for boards that have no layer of their own. The
 * encoder and its slots are interrupts; everything else is done as `loop` comes round, so stamps of
 * inputs and ends of pulses are as exact as that. There is no chip's watchdog here, no number kept over
 * resets, and the tick's cut-off stops with the loop: the monostable in series is not optional.
 */
#include "board.h"
#include <string.h>

slot_t slots[N_SLOTS + 1];
volatile uint8_t hal_permits, sketch_on, sketch_idle_high;
volatile int32_t sketch_count;
volatile uint16_t sketch_illegal;
volatile uint8_t sketch_poked;
uint16_t sketch_due;

static uint8_t output_pins[N_OUTPUTS], input_pins[N_INPUTS];
static uint8_t lines_before; /* B << 1 | A */
static uint32_t tick_us, last_us;
static uint16_t wraps;

/* ---- Outputs: the pins follow `sketch_on` and `sketch_idle_high` */

void sketch_drive(uint8_t mask) {
  uint8_t levels = sketch_on ^ sketch_idle_high;
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    if (mask & BIT(n)) digitalWrite(output_pins[n], levels & BIT(n) ? HIGH : LOW);
  }
}

/* ---- The encoder: four counts a cycle, A before B is up */

/* The count has come to the head's target: raise its output if it may, and take it out. */
static void hit(uint8_t rising) {
  slot_t *slot = slot_heads[rising];
  uint8_t rises = slot->fast & hal_permits;
  if (rises) hal_out_on(rises);
  hal_permits ^= rises;
  slot->rose = rises;
  slot->hit_ticks = hal_ticks();
  slot_heads[rising] = slot->next;
  slot_head_lows[rising] = (uint8_t)slot->next->target;
  sketch_poked = 1;
}

static uint8_t read_lines(void) {
  return (uint8_t)((digitalRead(PIN_B) == HIGH) << 1 | (digitalRead(PIN_A) == HIGH));
}

static void encoder_changed(void) {
  uint8_t now = read_lines(), changed = now ^ lines_before;
  if (changed == 0) return;
  if (changed == 3) {
    sketch_illegal++;
  } else {
    uint8_t up = (now ^ lines_before >> 1) & 1; /* A as it is and B as it was differ */
    sketch_count = (int32_t)((uint32_t)sketch_count + (up ? 1u : (uint32_t)-1));
    if (slot_heads[up] != &slots[N_SLOTS] && slot_heads[up]->target == sketch_count) hit(up);
  }
  lines_before = now;
}

/* ---- Time */

uint32_t hal_now_us(void) { return micros(); }

uint32_t hal_now_wraps(uint16_t *told) {
  uint32_t us = micros();
  *told = us < last_us ? wraps + 1 : wraps;
  return us;
}

uint32_t hal_extend_ticks(uint16_t ticks) {
  uint32_t us = micros();
  return us - ((uint16_t)((uint16_t)(us << 1) - ticks) >> 1);
}

/* ---- Falls and the service, as the loop comes round */

static bool due(uint16_t ticks) { return (int16_t)(uint16_t)(hal_ticks() - ticks) >= 0; }

/* What the timer's interrupt does on boards with a layer of their own. */
void sketch_falls(void) {
  while (falls_head->mask && due(falls_head->ticks)) {
    fall_t *fall = falls_head;
    hal_irq_off();
    hal_out_idle(fall->mask & sketch_on);
    fall->ticks = hal_ticks();
    fall->made = 1;
    falls_head = fall->next;
    hal_irq_on();
    sketch_poked = 1;
  }
}

static void service(void) {
  if (!sketch_poked && !due(sketch_due)) return;
  sketch_poked = 0;
  bank_hold();
  bank_release();
}

/* ---- What the core asks for besides */

void hal_alive(uint8_t fresh) {
  static uint8_t level;
  if (!fresh) return;
  level ^= 1;
  digitalWrite(PIN_ALIVE, level ? HIGH : LOW);
}

static const char model[17] = MODEL;
char hal_model(uint8_t i) { return model[i]; }

static uint8_t input_levels(void) {
  uint8_t levels = 0;
  for (uint8_t n = 0; n < N_INPUTS; n++) {
    if (digitalRead(input_pins[n]) == LOW) levels |= (uint8_t)(1u << n);
  }
  return levels;
}

static int32_t count_now(void) {
  hal_irq_off();
  int32_t count = sketch_count;
  hal_irq_on();
  return count;
}

/* Outputs are idle before their pins become outputs. */
void sketch_setup(uint32_t chance) {
  /* Names of pins are no constants on every board. */
  const uint8_t outs[N_OUTPUTS] = OUTPUT_PINS, ins[N_INPUTS] = INPUT_PINS;
  memcpy(output_pins, outs, N_OUTPUTS);
  memcpy(input_pins, ins, N_INPUTS);
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    digitalWrite(output_pins[n], LOW);
    pinMode(output_pins[n], OUTPUT);
  }
  for (uint8_t n = 0; n < N_INPUTS; n++) pinMode(input_pins[n], INPUT_PULLUP);
  pinMode(PIN_ALIVE, OUTPUT);
  pinMode(PIN_A, INPUT_PULLUP);
  pinMode(PIN_B, INPUT_PULLUP);
  chance ^= micros();
  if (chance == 0) chance = 1;
  xorshift32(&chance);
  boot_id = chance;
  board_id = 0;
  reset_cause = RESET_UNKNOWN;
  lines_before = read_lines();
  hal_input_levels = input_levels();
  tick_us = micros();
  board_begin();
  attachInterrupt(digitalPinToInterrupt(PIN_A), encoder_changed, CHANGE);
  attachInterrupt(digitalPinToInterrupt(PIN_B), encoder_changed, CHANGE);
}

void sketch_loop(void) {
  uint32_t us = micros();
  if (us < last_us) wraps++;
  last_us = us;
  sketch_falls();
  service();
  uint8_t levels = input_levels();
  if (levels != hal_input_levels) board_inputs(levels, us, count_now());
  if (us - tick_us >= 1000) {
    tick_us += 1000;
    board_tick();
  }
  board_round();
  hal_send();
}
