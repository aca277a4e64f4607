/*
 * What a board's layer gives to the core. `layer_board.h` (in the layer's folder) has the sizes, the
 * registers as macros or inline functions, and these:
 *
 *   N_OUTPUTS N_INPUTS N_SLOTS N_WAITING N_OUTCOMES N_EDGES N_FAULTS TX_BYTES
 *   cut_ms_t                          holds 2^32 us in ms
 *   hal_irq_off() hal_irq_on()        nothing may interrupt in between; not nested
 *   hal_ticks()                       a 16-bit clock of 0.5 us (interrupts off)
 *   hal_count() hal_illegal()         the encoder (interrupts off); hal_count_low() its low byte
 *   hal_outputs_on()                  bit n: output n is not idle (interrupts off, or one reading)
 *   hal_out_on(m) hal_out_idle(m)     moves pins (interrupts off)
 *   hal_idles_high(m) hal_set_idle(m, high)   idle levels; the pin follows while it is idle
 *   hal_permits                       a byte that the encoder's interrupt clears bits of
 *   hal_schedule(ticks)               then make the head of `falls` idle if it is due, and call the
 *                                     service; soon, if that is past (interrupts off)
 *   hal_wait()                        the service waits for a moment that is near
 *   HAL_FALL_TICKS                    so much later than asked for is a fall at least
 *   hal_poke()                        call the service soon
 *   hal_receive() hal_send()          a byte or -1; there is something in `tx_ring`
 *   hal_alive(fresh)                  a thousand times a second: feed the chip's watchdog, and the
 *                                     monostable while `fresh`
 *   hal_model(i)                      the i-th character of the model
 */
#ifndef LAPWING_LAYER_H
#define LAPWING_LAYER_H
#include <stdint.h>
#include "layer_board.h"

uint32_t hal_now_us(void);
uint32_t hal_now_wraps(uint16_t *wraps);
uint32_t hal_extend_ticks(uint16_t ticks); /* board time when the 16-bit clock last showed this */
extern volatile cut_ms_t hal_cut_ms[N_OUTPUTS];
extern volatile uint8_t hal_cut;
extern volatile uint8_t hal_input_levels;
#endif
