/** The parts of the C header that are the same for every map. */

export const checksumText = `/* CRC-32 of IEEE 802.3: reflected, polynomial 0x04C11DB7, initial and final 0xFFFFFFFF. */
static inline uint32_t oilspring_crc32(const void *data, size_t length)
{
    /* Four bits a step. */
    static const uint32_t table[16] = {
        0x00000000u, 0x1DB71064u, 0x3B6E20C8u, 0x26D930ACu, 0x76DC4190u, 0x6B6B51F4u, 0x4DB26158u, 0x5005713Cu,
        0xEDB88320u, 0xF00F9344u, 0xD6D6A3E8u, 0xCB61B38Cu, 0x9B64C2B0u, 0x86D3D2D4u, 0xA00AE278u, 0xBDBDF21Cu
    };
    const unsigned char *bytes = (const unsigned char *)data;
    uint32_t crc = 0xFFFFFFFFu;
    size_t i;
    for (i = 0; i < length; i += 1) {
        crc ^= bytes[i];
        crc = (crc >> 4) ^ table[crc & 15u];
        crc = (crc >> 4) ^ table[crc & 15u];
    }
    return crc ^ 0xFFFFFFFFu;
}

/* What oilspring_check says. Use the fields of a datagram only when it is OILSPRING_SOUND. */
enum oilspring_verdict {
    OILSPRING_SOUND = 0,
    OILSPRING_MALFORMED = 1,
    OILSPRING_WRONG_CHECKSUM = 2,
    OILSPRING_WRONG_MAP = 3,
    OILSPRING_WRONG_LENGTH = 4
};
`;

export const checkText = `static inline enum oilspring_verdict oilspring_check(const void *datagram, size_t length)
{
    struct oilspring_header header;
    uint32_t checksum;
    size_t expected = sizeof(struct oilspring_control);
    int whole;
    if (length < sizeof(struct oilspring_control))
        return OILSPRING_WRONG_LENGTH;
    memcpy(&header, datagram, sizeof header);
    if (header.magic != OILSPRING_MAGIC || header.version != OILSPRING_VERSION)
        return OILSPRING_MALFORMED;
    if (length > OILSPRING_GREATEST_LENGTH)
        return header.map == OILSPRING_MAP_CHECKSUM ? OILSPRING_WRONG_LENGTH : OILSPRING_WRONG_MAP;
    memcpy(&checksum, (const unsigned char *)datagram + length - 4, sizeof checksum);
    whole = checksum == oilspring_crc32(datagram, length - 4);
    if (whole && header.map != OILSPRING_MAP_CHECKSUM)
        return OILSPRING_WRONG_MAP;
    if (header.kind == OILSPRING_KIND_MESSAGE)
        expected = oilspring_length(header.message);
    else if (header.kind < OILSPRING_KIND_MESSAGE || header.kind > OILSPRING_KIND_HELLO)
        expected = 0u;
    if (expected == 0u)
        return whole ? OILSPRING_MALFORMED : OILSPRING_WRONG_CHECKSUM;
    if (length != expected)
        return OILSPRING_WRONG_LENGTH;
    return whole ? OILSPRING_SOUND : OILSPRING_WRONG_CHECKSUM;
}

static inline struct oilspring_header oilspring_make_header(enum oilspring_kind kind, uint16_t message, uint32_t sequence, uint32_t tick)
{
    struct oilspring_header header;
    header.magic = OILSPRING_MAGIC;
    header.version = (uint8_t)OILSPRING_VERSION;
    header.kind = (uint8_t)kind;
    header.message = message;
    header.sequence = sequence;
    header.tick = tick;
    header.map = OILSPRING_MAP_CHECKSUM;
    return header;
}

/* Fills in a datagram without fields; its length, bytes. */
static inline size_t oilspring_finish_control(struct oilspring_control *datagram, enum oilspring_kind kind, uint32_t sequence, uint32_t tick)
{
    datagram->header = oilspring_make_header(kind, 0u, sequence, tick);
    datagram->checksum = oilspring_crc32(datagram, sizeof *datagram - 4);
    return sizeof *datagram;
}

`;

export const numbersText = `/* The nearest whole number; halves go up. */
static inline int64_t oilspring_round(double value)
{
    double raised = value + 0.5;
    int64_t whole = (int64_t)raised;
    return (double)whole > raised ? whole - 1 : whole;
}

/* Brings *value into least .. most: 0 when it was inside, 1 when it was not, -1 when it is not finite. */
static inline int oilspring_limit(double *value, double least, double most)
{
    if (!(*value - *value == 0.0))
        return -1;
    if (*value < least) {
        *value = least;
        return 1;
    }
    if (*value > most) {
        *value = most;
        return 1;
    }
    return 0;
}
`;
