; The encoder's interrupt, for either line: four counts a cycle, A before B is up. It moves the count,
; compares it with the next target in its direction, raises the output of a slot that is hit, and
; leaves the rest to the service. What limits the board is the longest stretch with interrupts off.
#include "layer_board.h"
#define IO(reg) _SFR_IO_ADDR(reg)
#define SLOT_TARGET 0 /* the layout of slot_t in board.h */
#define SLOT_FAST 4
#define SLOT_ROSE 5
#define SLOT_HIT_TICKS 6
#define SLOT_NEXT 8
#define SLOT_STATE 10
#define HIT 2

; Compares the whole count with the target of the head of list `dir`, whose low byte it has already
; matched. A hit raises the slot's output if it has the permit, takes that, and takes the slot out.
; Written out for each direction: calls would cost ten cycles between the edge and the output.
.macro fire_head dir
  push r25
  lds r30, slot_heads + 2 * \dir
  lds r31, slot_heads + 2 * \dir + 1
  tst r31                       ; no slot: memory begins above that
  breq 3f
  ldd r24, Z + SLOT_TARGET + 1
  lds r25, count_high
  cp r24, r25
  brne 3f
  ldd r24, Z + SLOT_TARGET + 2
  lds r25, count_high + 1
  cp r24, r25
  brne 3f
  ldd r24, Z + SLOT_TARGET + 3
  lds r25, count_high + 2
  cp r24, r25
  brne 3f
  ldd r24, Z + SLOT_FAST
  in r25, IO(hal_permits)
  and r24, r25
  out IO(OUT_PIN), r24          ; the output rises here: a one in PINx toggles the pin
  eor r25, r24
  out IO(hal_permits), r25
  std Z + SLOT_ROSE, r24
  lds r24, TCNT1L
  lds r25, TCNT1H
  std Z + SLOT_HIT_TICKS, r24
  std Z + SLOT_HIT_TICKS + 1, r25
  sbi IO(EECR), EERIE           ; the service comes as soon as this is over
  ldi r24, HIT
  std Z + SLOT_STATE, r24
  lds r24, slot_hits
  inc r24
  sts slot_hits, r24
  ldd r24, Z + SLOT_NEXT
  ldd r25, Z + SLOT_NEXT + 1
  sts slot_heads + 2 * \dir + 1, r25
  sts slot_heads + 2 * \dir, r24
  mov r30, r24
  mov r31, r25
  ld r24, Z                     ; with an empty list this reads a register: no head, no match
  sts slot_head_lows + \dir, r24
3:
  pop r25
.endm

.data
.balign 16
steps:                          ; by now << 2 | before, lines as B << 1 | A; 2: both changed
  .byte 0, -1, 1, 2,  1, 0, 2, -1,  -1, 2, 0, 1,  2, 1, -1, 0

.text
.global ENCODER_VECTOR_A
.global ENCODER_VECTOR_B
ENCODER_VECTOR_A:
ENCODER_VECTOR_B:
  push r24
  in r24, IO(SREG)
  push r24
  push r30
  push r31
  in r30, IO(ENCODER_PIN)
#if ENCODER_SHIFT == 4
  lsr r30
  lsr r30
#endif
  andi r30, 0x0c
  in r24, IO(LEVELS_BEFORE)
  or r24, r30
  lsr r30
  lsr r30
  out IO(LEVELS_BEFORE), r30
  mov r30, r24
  ori r30, lo8(steps)
  ldi r31, hi8(steps)
  ld r24, Z
  in r30, IO(COUNT_LOW)
  tst r24
  breq leave
  brpl 5f
  rjmp down
5:
  sbrc r24, 1                   ; 2: no direction
  rjmp illegal
  inc r30
  out IO(COUNT_LOW), r30
  brne up
  rjmp carry
up:
  lds r31, slot_head_lows + 1
  cp r30, r31
  breq 4f
leave:
  pop r31
  pop r30
  pop r24
  out IO(SREG), r24
  pop r24
  reti
4:
  fire_head 1
  rjmp leave

down:
  subi r30, 1
  out IO(COUNT_LOW), r30
  brcc 1f
  rjmp borrow
1:
  lds r31, slot_head_lows
  cp r30, r31
  breq 2f
  rjmp leave
2:
  fire_head 0
  rjmp leave

carry:
  lds r31, count_high
  inc r31
  sts count_high, r31
  brne 6f
  lds r31, count_high + 1
  inc r31
  sts count_high + 1, r31
  brne 6f
  lds r31, count_high + 2
  inc r31
  sts count_high + 2, r31
6:
  rjmp up

borrow:
  lds r31, count_high
  subi r31, 1
  sts count_high, r31
  brcc 7f
  lds r31, count_high + 1
  subi r31, 1
  sts count_high + 1, r31
  brcc 7f
  lds r31, count_high + 2
  subi r31, 1
  sts count_high + 2, r31
7:
  rjmp 1b

illegal:
  lds r30, illegal_steps
  lds r31, illegal_steps + 1
  adiw r30, 1
  sts illegal_steps + 1, r31
  sts illegal_steps, r30
  rjmp leave
