/* The layer of the 8-bit AVR boards at 16 MHz: sizes, pins, registers. FIRMWARE.md shows the wiring. */
#ifndef LAPWING_LAYER_BOARD_H
#define LAPWING_LAYER_BOARD_H
#include <avr/io.h>
#ifndef __ASSEMBLER__
#include <avr/interrupt.h>
#include <avr/pgmspace.h>
#include <stdbool.h>
#include <stdint.h>
#endif

#define N_FAULTS 3

#if defined(__AVR_ATmega328P__)
#define N_OUTPUTS 6
#define N_INPUTS 5
#define N_SLOTS 8
#define N_WAITING 8
#define N_OUTCOMES 32
#define N_EDGES 8
#define RX_BYTES 64
#define TX_BYTES 64 /* an identity fills it */
#define LINE_RECEIVED USART_RX_vect
#define LINE_SENT USART_UDRE_vect
#define MODEL "ATmega328P 16MHz"
#define OUT_PORT PORTC /* A0 to A5 */
#define OUT_PIN PINC
#define OUT_DDR DDRC
#define IN_PORT PORTB /* D8 to D12; D13 is the boot loader's LED and left alone */
#define IN_PIN PINB
#define IN_MASK 0x1f
#define IN_CHANGES PCMSK0
#define IN_CHANGE_ENABLE PCIE0
#define IN_VECTOR PCINT0_vect
#define ENCODER_PORT PORTD /* D2: A, D3: B */
#define ENCODER_PIN PIND
#define ENCODER_SHIFT 2
#define ENCODER_SENSE() (EICRA = _BV(ISC00) | _BV(ISC10), EIMSK = _BV(INT0) | _BV(INT1))
#define ENCODER_VECTOR_A __vector_1
#define ENCODER_VECTOR_B __vector_2
#define ALIVE_PIN PIND /* D4 */
#define ALIVE_DDR DDRD
#define ALIVE_BIT 4
#elif defined(__AVR_ATmega2560__)
#define N_OUTPUTS 8
#define N_INPUTS 8
#define N_SLOTS 16
#define N_WAITING 16
#define N_OUTCOMES 64
#define N_EDGES 32
#define RX_BYTES 128
#define TX_BYTES 128
#define LINE_RECEIVED USART0_RX_vect
#define LINE_SENT USART0_UDRE_vect
#define MODEL "ATmega2560 16MHz"
#define OUT_PORT PORTA /* D22 to D29 */
#define OUT_PIN PINA
#define OUT_DDR DDRA
#define IN_PORT PORTK /* A8 to A15 */
#define IN_PIN PINK
#define IN_MASK 0xff
#define IN_CHANGES PCMSK2
#define IN_CHANGE_ENABLE PCIE2
#define IN_VECTOR PCINT2_vect
#define ENCODER_PORT PORTE /* D2: A, D3: B */
#define ENCODER_PIN PINE
#define ENCODER_SHIFT 4
#define ENCODER_SENSE() (EICRB = _BV(ISC40) | _BV(ISC50), EIMSK = _BV(INT4) | _BV(INT5))
#define ENCODER_VECTOR_A __vector_5
#define ENCODER_VECTOR_B __vector_6
#define ALIVE_PIN PING /* D4 */
#define ALIVE_DDR DDRG
#define ALIVE_BIT 5
#else
#error "No pins are given for this chip."
#endif

#define OUT_MASK ((uint8_t)((1u << N_OUTPUTS) - 1))
#define LEVELS_BEFORE GPIOR0 /* the encoder's port as it was */
#define COUNT_LOW GPIOR1     /* the count, byte by byte: the last three in a timer that stands still */
#define COUNT_1 OCR0A
#define COUNT_2 OCR0B
#define COUNT_3 TCNT0
#define hal_permits GPIOR2
#define SERVICE_VECTOR SPM_READY_vect /* jumped to by service.S; the chip never comes to it */

#ifndef __ASSEMBLER__
typedef __uint24 cut_ms_t; /* 4.6 hours */
extern volatile uint8_t idle_levels;
extern volatile uint16_t illegal_steps;

#define hal_irq_off() cli()
#define hal_irq_on() sei()
#define hal_barrier() __asm__ __volatile__("" ::: "memory")
#define hal_ticks() TCNT1
static inline int32_t hal_count(void) {
  union { uint8_t byte[4]; int32_t whole; } count;
  count.byte[0] = COUNT_LOW;
  count.byte[1] = COUNT_1;
  count.byte[2] = COUNT_2;
  count.byte[3] = COUNT_3;
  return count.whole;
}
#define hal_illegal() illegal_steps
#define hal_outputs_on() ((uint8_t)((OUT_PORT ^ idle_levels) & OUT_MASK))
static inline void hal_out_idle(uint8_t mask) {
  OUT_PORT = (uint8_t)((OUT_PORT & ~mask) | (idle_levels & mask));
}
static inline void hal_out_on(uint8_t mask) {
  OUT_PORT = (uint8_t)((OUT_PORT & ~mask) | (~idle_levels & mask));
}
#define hal_idles_high(mask) ((idle_levels & (mask)) != 0)
static inline void hal_set_idle(uint8_t mask, bool high) {
  if (hal_idles_high(mask) == high) return;
  idle_levels ^= mask;
  OUT_PIN = mask; /* writing PINx toggles: idle or on, it stays what it was */
}
#define HAL_FALL_TICKS 4 /* service.S: from the compare to the pin, at least 38 cycles */
static inline void hal_schedule(uint16_t ticks) {
  uint16_t soonest = TCNT1 + 8;
  if ((int16_t)(ticks - soonest) < 0) ticks = soonest;
  OCR1B = ticks;
}
static inline void hal_poke(void) { EECR |= _BV(EERIE); }
#define hal_count_low() COUNT_LOW
#define hal_wait() /* the interrupts go on */
int16_t hal_receive(void);
void hal_send(void);
void hal_alive(uint8_t fresh);
char hal_model(uint8_t i);
#endif
#endif
