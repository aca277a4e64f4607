; The service's interrupt. The chip has none that a program can raise by itself, so it is the EEPROM's
; "ready": that asks for as long as it is enabled, and nothing is written after the beginning.
; Whoever comes while the service, or the main loop in its place, is at work leaves word and goes:
; few registers are saved for that, so that interrupts are not off for long.
#include "layer_board.h"
#define IO(reg) _SFR_IO_ADDR(reg)

.global EE_READY_vect
EE_READY_vect:
  cbi IO(EECR), EERIE
  push r24
  in r24, IO(SREG)
  push r24
  lds r24, bank_held
  tst r24
  breq 1f
  sts bank_wanted, r24
  pop r24
  out IO(SREG), r24
  pop r24
  reti
1:
  pop r24
  out IO(SREG), r24
  pop r24
  jmp SERVICE_VECTOR

; The timer's compare: what was set up to fall, if it is time, and then the service.
.global TIMER1_COMPB_vect
TIMER1_COMPB_vect:
  push r24
  in r24, IO(SREG)
  push r24
  lds r24, fall_mask
  tst r24
  breq 4f
  push r25
  push r30
  push r31
  lds r30, TCNT1L
  lds r31, TCNT1H
  lds r24, fall_ticks
  lds r25, fall_ticks + 1
  sub r24, r30
  sbc r25, r31
  brlt 2f
  or r24, r25
  brne 3f
2:
  in r25, IO(OUT_PORT)
  lds r24, idle_levels
  eor r25, r24
  lds r24, fall_mask
  and r25, r24
  out IO(OUT_PIN), r25          ; those of them that are on, toggled
  lds r25, hal_dropped
  or r25, r24
  sts hal_dropped, r25
  sts hal_dropped_ticks, r30
  sts hal_dropped_ticks + 1, r31
  ldi r24, 0
  sts fall_mask, r24
3:
  pop r31
  pop r30
  pop r25
4:
  sbi IO(EECR), EERIE
  pop r24
  out IO(SREG), r24
  pop r24
  reti
