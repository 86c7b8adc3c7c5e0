/* Checksums of lines, answers, curves and memory slots. No large tables: flash is small. */
#include "parts.h"

/** One byte into CRC-16/IBM-3740 (polynomial 0x1021, start 0xFFFF, not reflected). */
uint16_t core_crc16_add(uint16_t crc, uint8_t byte) {
  uint8_t x = (uint8_t)((uint8_t)(crc >> 8) ^ byte);
  x = (uint8_t)(x ^ (uint8_t)(x >> 4));
  return (uint16_t)((uint16_t)(crc << 8) ^ (uint16_t)((uint16_t)x << 12) ^
                    (uint16_t)((uint16_t)x << 5) ^ (uint16_t)x);
}

/** CRC-16 of `length` bytes. */
uint16_t core_crc16(const uint8_t *bytes, uint16_t length) {
  uint16_t crc = CORE_CRC16_START;
  for (uint16_t i = 0; i < length; i++) crc = core_crc16_add(crc, bytes[i]);
  return crc;
}

/* The reflected polynomial 0xEDB88320, four bits at a time. */
static const CORE_FLASH uint32_t nibbles[16] = {
    0x00000000ul, 0x1DB71064ul, 0x3B6E20C8ul, 0x26D930ACul, 0x76DC4190ul, 0x6B6B51F4ul,
    0x4DB26158ul, 0x5005713Cul, 0xEDB88320ul, 0xF00F9344ul, 0xD6D6A3E8ul, 0xCB61B38Cul,
    0x9B64C2B0ul, 0x86D3D2D4ul, 0xA00AE278ul, 0xBDBDF21Cul};

/** One byte into the common CRC-32; start with CORE_CRC32_START, close with CORE_CRC32_END. */
uint32_t core_crc32_add(uint32_t crc, uint8_t byte) {
  crc ^= byte;
  crc = (crc >> 4) ^ nibbles[crc & 15u];
  return (crc >> 4) ^ nibbles[crc & 15u];
}

/** Four bytes, lowest first. */
uint32_t core_crc32_add_u32(uint32_t crc, uint32_t value) {
  for (uint8_t i = 0; i < 4u; i++) {
    crc = core_crc32_add(crc, (uint8_t)(value & 0xFFu));
    value >>= 8;
  }
  return crc;
}
