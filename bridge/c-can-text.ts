/** The parts of the C header that all CAN messages share. */
export const canHelpers = `/* The nearest whole number as raw bits; halves go up. For values within 64 bits. */
static inline uint64_t oilspring_raw(double value)
{
    double size = value < 0.0 ? -value : value;
    if (size < 4503599627370496.0) {
        double whole = (double)(int64_t)value;
        if (whole > value)
            whole -= 1.0;
        value = value - whole >= 0.5 ? whole + 1.0 : whole;
    }
    return value < 0.0 ? (uint64_t)(int64_t)value : (uint64_t)value;
}

/* A register of a cyclic redundancy check after one byte more: highest bit first, of 8 or 16 bits; lowest bit first, of 32. */
static inline uint32_t oilspring_crc_left(unsigned width, uint32_t polynomial, uint32_t value, uint8_t byte)
{
    unsigned i;
    value ^= (uint32_t)byte << (width - 8u);
    for (i = 0u; i < 8u; i += 1u)
        value = (value >> (width - 1u) & 1u) != 0u ? value << 1 ^ polynomial : value << 1;
    return value & ((1u << width) - 1u);
}

static inline uint32_t oilspring_crc_right(uint32_t polynomial, uint32_t value, uint8_t byte)
{
    unsigned i;
    value ^= byte;
    for (i = 0u; i < 8u; i += 1u)
        value = (value & 1u) != 0u ? value >> 1 ^ polynomial : value >> 1;
    return value;
}
`;
