#include "chip.h"

#include <simavr/avr_adc.h>
#include <simavr/avr_eeprom.h>
#include <simavr/avr_ioport.h>
#include <simavr/avr_uart.h>
#include <simavr/sim_avr.h>
#include <simavr/sim_elf.h>
#include <stdio.h>
#include <string.h>

#include "pins.h"

/* Data-space addresses of the ATmega328P's registers that the runner reads. */
#define REG_PORTB 0x25
#define REG_DDRB 0x24
#define REG_PORTD 0x2b
#define REG_DDRD 0x2a
#define REG_MCUSR 0x54
#define REG_TCCR1A 0x80
#define REG_TCCR1B 0x81
#define REG_OCR1AL 0x88
#define REG_OCR1AH 0x89
#define RAM_START 0x100u
#define COM1A1 0x80
#define CS1_MASK 0x07
#define RAM_FILL 0xc5

#define DATA_OFFSET 0x800000u
#define WIRE_BYTES_MAX 65536u    /* a 2 s buffer at 115200 baud is 23 kB */
#define BYTE_CYCLES (CPU_HZ * 10u / 115200u)
#define BREAK_MARK 0x8000u       /* the simulator's framing error flag, with a zero byte */
#define RUN_CYCLES_MAX 200u      /* so that bytes and plant steps are at most 12.5 us late */

struct chip chip;

static avr_t *avr;
static elf_firmware_t firmware;
static struct chip_events events;
static void (*modelReset)(struct avr_t *);
static bool wasReset, uartFull, lineEnded, lastEnable, allInputs;
static uint8_t lastLevels;
static uint64_t nextPlant, nextByte, lastEdge;
static avr_irq_t *keyIrq, *loopIrq, *buttonIrq, *inputIrq[PLANT_INPUTS], *receiveIrq;
static uint16_t wire[WIRE_BYTES_MAX];
static size_t wireHead, wireCount;
static struct { uint32_t address; uint8_t bytes[2]; bool held; } hung;

static void quietLog(struct avr_t *a, const int level, const char *format, va_list args) {
  (void)a;
  if (level == 1 /* LOG_ERROR */) vfprintf(stderr, format, args);
}

static void noSleep(struct avr_t *a, avr_cycle_count_t cycles) {
  (void)a;
  (void)cycles; /* Simulated time only: nothing waits for the wall clock here. */
}

static void onReset(struct avr_t *a) {
  if (modelReset) modelReset(a);
  wasReset = true;
}

static void onSent(struct avr_irq_t *irq, uint32_t value, void *param) {
  (void)irq;
  (void)param;
  if ((value & 0xff) == '\n') lineEnded = true;
  events.sent(avr->cycle, (uint8_t)value);
}

static void onUartRoom(struct avr_irq_t *irq, uint32_t value, void *param) {
  (void)irq;
  (void)value;
  uartFull = param != NULL;
}

static avr_irq_t *uartIrq(int n) { return avr_io_getirq(avr, AVR_IOCTL_UART_GETIRQ('0'), n); }

static avr_irq_t *pinIrq(int pin) {
  return avr_io_getirq(avr, AVR_IOCTL_IOPORT_GETIRQ('D'), pin);
}

static void findWires(void) {
  receiveIrq = uartIrq(UART_IRQ_INPUT);
  avr_irq_register_notify(uartIrq(UART_IRQ_OUTPUT), onSent, NULL);
  avr_irq_register_notify(uartIrq(UART_IRQ_OUT_XON), onUartRoom, NULL);
  avr_irq_register_notify(uartIrq(UART_IRQ_OUT_XOFF), onUartRoom, &uartFull);
  keyIrq = pinIrq(PIN_KEY);
  loopIrq = pinIrq(PIN_LOOP);
  buttonIrq = pinIrq(PIN_BUTTON);
  for (int n = 0; n < PLANT_INPUTS; n++) inputIrq[n] = avr_io_getirq(avr, AVR_IOCTL_ADC_GETIRQ, n);
}

bool chip_load(const char *elfPath, const struct chip_events *wanted) {
  events = *wanted;
  avr_global_logger_set(quietLog);
  if (elf_read_firmware(elfPath, &firmware) != 0 || firmware.flashsize == 0) {
    fprintf(stderr, "%s is not firmware that can be read; build it with make first\n", elfPath);
    return false;
  }
  avr = avr_make_mcu_by_name("atmega328p");
  if (!avr) {
    fprintf(stderr, "libsimavr has no atmega328p\n");
    return false;
  }
  avr_init(avr);
  firmware.frequency = CPU_HZ;
  firmware.vcc = firmware.avcc = firmware.aref = 5000;
  avr_load_firmware(avr, &firmware);
  avr->run_cycle_limit = RUN_CYCLES_MAX;
  avr->sleep = noSleep;
  modelReset = avr->reset;
  avr->reset = onReset;

  uint32_t flags = 0;
  avr_ioctl(avr, AVR_IOCTL_UART_GET_FLAGS('0'), &flags);
  flags &= ~(uint32_t)(AVR_UART_FLAG_STDIO | AVR_UART_FLAG_POLL_SLEEP);
  avr_ioctl(avr, AVR_IOCTL_UART_SET_FLAGS('0'), &flags);
  findWires();

  chip.key = chip.loop = true;
  chip.oneShot_ms = 75;
  plant_init(&chip.plant);
  return chip_reset("power");
}

uint64_t chip_cycle(void) { return avr->cycle; }

bool chip_receive(uint8_t byte, bool isBreak) {
  if (wireCount == WIRE_BYTES_MAX) return false;
  wire[(wireHead + wireCount++) % WIRE_BYTES_MAX] = isBreak ? BREAK_MARK : byte;
  if (nextByte < avr->cycle) nextByte = avr->cycle;
  return true;
}

static void pumpWire(void) {
  while (wireCount > 0 && !uartFull && avr->cycle >= nextByte + BYTE_CYCLES) {
    const uint16_t value = wire[wireHead];
    wireHead = (wireHead + 1) % WIRE_BYTES_MAX;
    wireCount--;
    nextByte += BYTE_CYCLES;
    avr_raise_irq(receiveIrq, value);
  }
}

/* Signals are raised on a change only: each costs as much as hundreds of instructions. */
static void drive(avr_irq_t *irq, uint32_t value) {
  if (allInputs || irq->value != value) avr_raise_irq(irq, value);
}

/* The levels are told to the port as well: at each write to it the simulator would otherwise let
 * the pull-ups win over the contacts. */
static void applyInputs(void) {
  const uint8_t levels = (uint8_t)(!chip.key << PIN_KEY | !chip.loop << PIN_LOOP |
                                   !chip.button << PIN_BUTTON);
  if (allInputs || levels != lastLevels) {
    const avr_ioport_external_t external = {
        .name = 'D', .mask = 1u << PIN_KEY | 1u << PIN_LOOP | 1u << PIN_BUTTON, .value = levels};
    avr_ioctl(avr, AVR_IOCTL_IOPORT_SET_EXTERNAL('D'), (void *)&external);
    lastLevels = levels;
  }
  drive(keyIrq, !chip.key);
  drive(loopIrq, !chip.loop);
  drive(buttonIrq, !chip.button);
  for (int n = 0; n < PLANT_INPUTS; n++) drive(inputIrq[n], chip.plant.input_mV[n]);
  allInputs = false;
}

/* The simulator's pulse-width signal is unreliable over a reset: the registers are not. */
static uint16_t driveNow(void) {
  const uint8_t *r = avr->data;
  const bool connected = (r[REG_TCCR1A] & COM1A1) && (r[REG_DDRB] & (1u << PIN_DRIVE));
  if (!connected) {
    const uint8_t mask = r[REG_DDRB] & r[REG_PORTB];
    return mask & (1u << PIN_DRIVE) ? 1023 : 0; /* a pin held high would be full current */
  }
  if (!(r[REG_TCCR1B] & CS1_MASK)) return 1023; /* connected to a stopped timer: the worst */
  return (uint16_t)(r[REG_OCR1AL] | r[REG_OCR1AH] << 8) & 1023u;
}

static void readOutputs(void) {
  const uint8_t *r = avr->data;
  const bool enable = r[REG_DDRB] & r[REG_PORTB] & (1u << PIN_ENABLE);
  if (enable && !lastEnable) { /* the one-shot of the board's README starts on rising edges */
    lastEdge = avr->cycle;
    chip.edges++;
  }
  lastEnable = enable;
  const uint16_t drive = driveNow();
  const bool stage =
      chip.edges > 0 && avr->cycle - lastEdge < (uint64_t)chip.oneShot_ms * CYCLES_A_MS;
  const bool indicator = r[REG_DDRD] & r[REG_PORTD] & (1u << PIN_INDICATOR);
  const bool lit = chip.plant.current_mA >= DARK_MA;
  const bool told = drive != chip.drive || stage != chip.stage || indicator != chip.indicator ||
                    lit != chip.lit;
  chip.drive = drive;
  chip.stage = stage;
  chip.indicator = indicator;
  chip.lit = lit;
  if (told) events.output(avr->cycle);
}

static void stepPlant(void) {
  readOutputs();
  plant_step(&chip.plant, chip.drive, chip.stage);
  applyInputs();
}

void chip_run(uint64_t cycle, bool stopAtLine) {
  lineEnded = false;
  while (avr->cycle < cycle && !(stopAtLine && lineEnded)) {
    if (wasReset) {
      wasReset = false;
      uartFull = false;
      allInputs = true; /* a reset has forgotten them */
      applyInputs();
      events.reset(avr->cycle);
    }
    while (avr->cycle >= nextPlant) {
      stepPlant();
      nextPlant += PLANT_CYCLES;
    }
    pumpWire();
    const int state = avr_run(avr);
    if (state == cpu_Done || state == cpu_Crashed) {
      fprintf(stderr, "the simulated chip stopped: state %d at pc 0x%x\n", state, avr->pc);
      return;
    }
  }
}

static void fillRam(void) {
  memset(avr->data + RAM_START, RAM_FILL, avr->ramend + 1u - RAM_START);
}

bool chip_reset(const char *kind) {
  static const struct { const char *name; uint8_t flag; bool losesRam; } kinds[] = {
      {"power", 0x01, true}, {"external", 0x02, false}, {"brown-out", 0x04, true},
      {"watchdog", 0x08, false}};
  for (size_t n = 0; n < sizeof kinds / sizeof kinds[0]; n++) {
    if (strcmp(kind, kinds[n].name) != 0) continue;
    avr_reset(avr);
    avr->state = cpu_Running;
    avr->data[REG_MCUSR] = kinds[n].flag;
    if (kinds[n].losesRam) fillRam();
    return true;
  }
  return false;
}

bool chip_symbol(const char *name, uint32_t *address, bool *isData) {
  for (uint32_t n = 0; n < firmware.symbolcount; n++) {
    const avr_symbol_t *symbol = firmware.symbol[n];
    if (strcmp(symbol->symbol, name) != 0) continue;
    *isData = symbol->addr >= DATA_OFFSET;
    *address = *isData ? symbol->addr - DATA_OFFSET : symbol->addr;
    return true;
  }
  return false;
}

uint8_t *chip_ram(uint32_t address, size_t length) {
  return address + length <= avr->ramend + 1u ? avr->data + address : NULL;
}

uint8_t *chip_flash(uint32_t address, size_t length) {
  return address + length <= avr->flashend + 1u ? avr->flash + address : NULL;
}

uint8_t *chip_eeprom(size_t *length) {
  avr_eeprom_desc_t desc = {.ee = NULL, .offset = 0, .size = avr->e2end + 1u};
  *length = desc.size;
  return avr_ioctl(avr, AVR_IOCTL_EEPROM_GET, &desc) < 0 ? NULL : desc.ee;
}

uint32_t chip_stack(void) {
  uint32_t address = 0;
  bool isData = false;
  if (!chip_symbol("_end", &address, &isData)) return 0;
  while (address <= avr->ramend && avr->data[address] == RAM_FILL) address++;
  return avr->ramend + 1u - address;
}

bool chip_hang(const char *symbol) {
  uint32_t address = 0;
  bool isData = false;
  if (hung.held || !chip_symbol(symbol, &address, &isData) || isData) return false;
  uint8_t *code = chip_flash(address, 2);
  if (!code) return false;
  hung.address = address;
  hung.held = true;
  memcpy(hung.bytes, code, 2);
  code[0] = 0xff; /* rjmp .-2, low byte first */
  code[1] = 0xcf;
  return true;
}

void chip_mend(void) {
  if (!hung.held) return;
  memcpy(chip_flash(hung.address, 2), hung.bytes, 2);
  hung.held = false;
}
