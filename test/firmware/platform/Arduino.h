/*
 * What the firmware's sketch asks of the hobby platform, declared and no more: it is compiled against
 * this where the platform's own sources are not installed.
 */
#ifndef PLATFORM_H
#define PLATFORM_H
#include <stdint.h>
#define HIGH 1
#define LOW 0
#define INPUT_PULLUP 2
#define OUTPUT 1
#define CHANGE 1
static const uint8_t A0 = 14, A1 = 15, A2 = 16, A3 = 17, A4 = 18;
#ifdef __cplusplus
extern "C" {
#endif
void pinMode(uint8_t pin, uint8_t mode);
void digitalWrite(uint8_t pin, uint8_t level);
int digitalRead(uint8_t pin);
int analogRead(uint8_t pin);
unsigned long micros(void);
void attachInterrupt(uint8_t number, void (*call)(void), int mode);
void noInterrupts(void);
void interrupts(void);
int digitalPinToInterrupt(int pin);
#ifdef __cplusplus
}
struct Line {
  void begin(unsigned long baud);
  int read();
  int availableForWrite();
  unsigned write(uint8_t byte);
};
extern Line Serial;
#endif
#endif
