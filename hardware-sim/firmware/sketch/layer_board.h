/*
 * The layer of the sketch: sizes, pins, and the core's macros over the hobby platform's own functions.
 * Pins are numbers as that platform counts them: change them to suit the board.
 */
#ifndef LAPWING_LAYER_BOARD_H
#define LAPWING_LAYER_BOARD_H
#include <Arduino.h>
#include <stdbool.h>
#include <stdint.h>

#define PIN_A 2 /* the encoder; both must be able to interrupt */
#define PIN_B 3
#define PIN_ALIVE 4
#define OUTPUT_PINS {A0, A1, A2, A3}
#define INPUT_PINS {8, 9, 10, 11, 12}
#define N_OUTPUTS 4
#define N_INPUTS 5
#define N_SLOTS 8
#define N_WAITING 8
#define N_OUTCOMES 32
#define N_EDGES 8
#define N_FAULTS 3
#define TX_BYTES 64
#define MODEL "sketch"

typedef uint32_t cut_ms_t;
extern volatile uint8_t hal_permits, sketch_on, sketch_idle_high;
extern volatile int32_t sketch_count;
extern volatile uint16_t sketch_illegal;
extern volatile uint8_t sketch_poked;
extern uint16_t sketch_due;
void sketch_drive(uint8_t mask);
void sketch_falls(void);

#define hal_irq_off() noInterrupts()
#define hal_irq_on() interrupts()
#define hal_barrier() __asm__ __volatile__("" ::: "memory")
#define hal_ticks() ((uint16_t)(micros() << 1))
#define hal_count() sketch_count
#define hal_count_low() ((uint8_t)sketch_count)
#define hal_illegal() sketch_illegal
#define hal_outputs_on() sketch_on
static inline void hal_out_on(uint8_t mask) {
  sketch_on |= mask;
  sketch_drive(mask);
}
static inline void hal_out_idle(uint8_t mask) {
  sketch_on &= (uint8_t)~mask;
  sketch_drive(mask);
}
#define hal_idles_high(mask) ((sketch_idle_high & (mask)) != 0)
static inline void hal_set_idle(uint8_t mask, bool high) {
  if (high) sketch_idle_high |= mask;
  else sketch_idle_high &= (uint8_t)~mask;
  sketch_drive(mask);
}
#define HAL_FALL_TICKS 0
static inline void hal_schedule(uint16_t ticks) { sketch_due = ticks; }
static inline void hal_poke(void) { sketch_poked = 1; }
#define hal_wait() sketch_falls()
int16_t hal_receive(void);
void hal_send(void);
void hal_alive(uint8_t fresh);
char hal_model(uint8_t i);
#endif
