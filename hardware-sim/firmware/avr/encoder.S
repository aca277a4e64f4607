; The encoder's interrupt, for either line: four counts a cycle, A before B is up. It moves the count,
; compares it with the next target in its direction, raises the output of a slot that is hit, takes
; the slot out of its list, and leaves the rest to the service. What limits the board is the longest
; stretch with interrupts off: a test holds every one to less than 100 cycles. So what it works with
; is kept in registers of the chip that nothing else uses, and what it has to save goes into r2 to r6,
; which the compiler is told to leave alone.
#include "layer_board.h"
#define IO(reg) _SFR_IO_ADDR(reg)
#define SLOT_TARGET 0 /* the layout of slot_t in board.h */
#define SLOT_FAST 4
#define SLOT_ROSE 5
#define SLOT_HIT_TICKS 6
#define SLOT_NEXT 8
#define SLOT_BYTES 10
#define LINES (3 << ENCODER_SHIFT)
#define LINE_B (ENCODER_SHIFT + 1)

; All slots lie in one page, so that one byte says which: the high one is always the same. This file
; is linked first, so the page is the memory's first; build.sh looks whether it is.
.data
.global slots
slots: .space SLOT_BYTES * (N_SLOTS + 1)

; Compares the count's high bytes with the target of the head of list `dir`, whose low byte has been
; matched already. A hit raises the slot's output if it has the permit, takes that, and takes the
; slot out. At the end of a list stands a slot that raises nothing and is followed by itself.
; Written out for each direction: calls would cost ten cycles between the edge and the output.
.macro fire_head dir
  mov r6, r25
  lds r30, slot_heads + 2 * \dir
  ldi r31, hi8(slots)
  ldd r24, Z + SLOT_TARGET + 1
  in r25, IO(COUNT_1)
  cp r24, r25
  ldd r24, Z + SLOT_TARGET + 2
  in r25, IO(COUNT_2)
  cpc r24, r25
  ldd r24, Z + SLOT_TARGET + 3
  in r25, IO(COUNT_3)
  cpc r24, r25
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
  ldd r30, Z + SLOT_NEXT
  sts slot_heads + 2 * \dir, r30
  ld r24, Z
  sts slot_head_lows + \dir, r24
3:
  mov r25, r6
  leave
.endm

.macro leave
  movw r30, r4
  mov r24, r3
  out IO(SREG), r2
  reti
.endm

.text
.global ENCODER_VECTOR_A
.global ENCODER_VECTOR_B
ENCODER_VECTOR_A:
ENCODER_VECTOR_B:
  in r2, IO(SREG)
  mov r3, r24
  movw r4, r30
  in r30, IO(ENCODER_PIN)
  in r31, IO(LEVELS_BEFORE)
  out IO(LEVELS_BEFORE), r30
  mov r24, r30
  eor r24, r31
  andi r24, LINES
  breq none
  cpi r24, LINES
  breq illegal                  ; both have changed: no direction
  lsl r30                       ; up: A as it is and B as it was differ
  eor r30, r31
  in r31, IO(COUNT_LOW)
  sbrs r30, LINE_B
  rjmp down
  subi r31, 0xff
  out IO(COUNT_LOW), r31
  breq carry
up:
  lds r30, slot_head_lows + 1
  cp r30, r31
  breq hit_up
none:
  leave
carry:                          ; 0xff taken away without a borrow is one more
  in r30, IO(COUNT_1)
  sbci r30, 0xff
  out IO(COUNT_1), r30
  in r30, IO(COUNT_2)
  sbci r30, 0xff
  out IO(COUNT_2), r30
  in r30, IO(COUNT_3)
  sbci r30, 0xff
  out IO(COUNT_3), r30
  rjmp up
illegal:
  lds r30, illegal_steps
  lds r31, illegal_steps + 1
  adiw r30, 1
  sts illegal_steps + 1, r31
  sts illegal_steps, r30
  leave
hit_up:
  fire_head 1

down:
  subi r31, 1
  out IO(COUNT_LOW), r31
  brcs borrow
1:
  lds r30, slot_head_lows
  cp r30, r31
  breq hit_down
  leave
borrow:
  in r30, IO(COUNT_1)
  sbci r30, 0
  out IO(COUNT_1), r30
  in r30, IO(COUNT_2)
  sbci r30, 0
  out IO(COUNT_2), r30
  in r30, IO(COUNT_3)
  sbci r30, 0
  out IO(COUNT_3), r30
  rjmp 1b
hit_down:
  fire_head 0
