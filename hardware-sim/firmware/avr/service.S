; The service's interrupt. The chip has none that a program can raise by itself, so it is the EEPROM's
; "ready": that asks for as long as it is enabled, and nothing is written after the beginning.
; Whoever comes while the service, or the main loop in its place, is at work leaves word and goes.
; What is saved goes into r2 to r6, as in encoder.S: interrupts are off for all of it.
#include "layer_board.h"
#define IO(reg) _SFR_IO_ADDR(reg)
#define FALL_TICKS 0 /* the layout of fall_t in board.h */
#define FALL_MASK 2
#define FALL_MADE 3
#define FALL_NEXT 4
/* From the clock's reading below to the next compare's being set up, and a little. */
#define SOONEST_TICKS 8

.global EE_READY_vect
EE_READY_vect:
  cbi IO(EECR), EERIE
  in r2, IO(SREG)
  mov r3, r24
  lds r24, bank_held
  tst r24
  breq 1f
  sts bank_wanted, r24
  mov r24, r3
  out IO(SREG), r2
  reti
1:
  mov r24, r3
  out IO(SREG), r2
  jmp SERVICE_VECTOR

; The timer's compare: the next fall, if it is time, and then the service. The fall that comes next is
; set up here and now, so that it is as exact, whatever the board is doing. One interrupt makes one fall, and
; lets the encoder in between.
.global TIMER1_COMPB_vect
TIMER1_COMPB_vect:
  in r2, IO(SREG)
  mov r3, r24
  movw r4, r30
  mov r6, r25
  push r18
  push r19
  lds r30, falls_head
  lds r31, falls_head + 1
  ldd r24, Z + FALL_TICKS
  ldd r25, Z + FALL_TICKS + 1
  lds r18, TCNT1L
  lds r19, TCNT1H
  cp r18, r24
  cpc r19, r25
  brmi 1f                       ; not yet: it is the service's time that has come
  in r24, IO(OUT_PORT)
  lds r25, idle_levels
  eor r24, r25
  ldd r25, Z + FALL_MASK
  and r24, r25
  out IO(OUT_PIN), r24          ; those of them that are on, toggled
  std Z + FALL_TICKS, r18
  std Z + FALL_TICKS + 1, r19
  ldi r24, 1
  std Z + FALL_MADE, r24
  ldd r24, Z + FALL_NEXT
  ldd r25, Z + FALL_NEXT + 1
  sts falls_head + 1, r25
  sts falls_head, r24
  movw r30, r24
1:
  ldd r24, Z + FALL_MASK
  tst r24
  breq 3f                       ; the list's end
  ldd r24, Z + FALL_TICKS
  ldd r25, Z + FALL_TICKS + 1
  subi r18, lo8(-SOONEST_TICKS)
  sbci r19, hi8(-SOONEST_TICKS)
  cp r24, r18
  cpc r25, r19
  brpl 2f
  movw r24, r18
2:
  sts OCR1BH, r25
  sts OCR1BL, r24
3:
  sbi IO(EECR), EERIE
  pop r19
  pop r18
  mov r25, r6
  movw r30, r4
  mov r24, r3
  out IO(SREG), r2
  reti
