/* The main loop's round, and the 1 kHz tick. */
#include "board.h"

uint32_t boot_id, board_id;
uint8_t reset_cause;
volatile cut_ms_t hal_cut_ms[N_OUTPUTS];
volatile mask_t hal_cut;
volatile uint8_t hal_input_levels;
static volatile uint8_t ticks;

/* On without the service having set its cut-off: this many ticks are borne. */
#define UNBOOKED_TICKS 3

/* Interrupt context, interrupts on: the second, independent cut-off, whatever the service does. */
void board_tick(void) {
  ticks++;
  mask_t on = hal_outputs_on();
  for (uint8_t n = 0; n < N_OUTPUTS; n++) {
    if (!(on & BIT(n))) continue;
    hal_irq_off();
    cut_ms_t ms = hal_cut_ms[n];
    if (ms == 0) ms = UNBOOKED_TICKS;
    if (--ms == 0) {
      hal_out_idle(BIT(n));
      hal_cut |= BIT(n);
      hal_permits &= (mask_t)~BIT(n);
    } else {
      hal_cut_ms[n] = ms;
    }
    hal_irq_on();
  }
  if (hal_cut) hal_poke();
}

/* Call once, interrupts still off, after the layer's own beginning. */
void board_begin(void) {
  slots_begin();
  falls_begin();
  voice_boot();
}

/* One round of the main loop. False: nothing to do until an interrupt comes. */
bool board_round(void) {
  int16_t byte = hal_receive();
  if (byte >= 0) {
    frame_byte((uint8_t)byte);
    return true;
  }
  if (ticks) {
    hal_irq_off();
    ticks--;
    hal_irq_on();
    hal_alive(host_fresh);
    command_tick();
    voice_tick();
    return true;
  }
  return voice_speak();
}
