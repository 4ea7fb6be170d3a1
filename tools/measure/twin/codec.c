/*
 * Cost of packing and unpacking two messages of the harbour truck on CAN, by the header that `wire --c` writes.
 *
 *   codec ROUNDS    prints {"message":[ns to pack and protect, ns to verify and unpack], ...} of processor time
 */
#include "messages.h"

#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static double now(void)
{
    struct timespec time;
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &time);
    return (double)time.tv_sec * 1e9 + (double)time.tv_nsec;
}

/* What is written here is taken for used. */
static volatile double sink;

#define MEASURE(name, first, second)                                                                                   \
    do {                                                                                                               \
        static uint8_t payloads[256][OILSPRING_##name##_LENGTH];                                                       \
        struct oilspring_##name message;                                                                               \
        double began, packed, unpacked;                                                                                \
        long i;                                                                                                        \
        memset(&message, 0, sizeof message);                                                                           \
        began = now();                                                                                                 \
        for (i = 0; i < rounds; i += 1) {                                                                              \
            message.first = (double)(i & 127);                                                                         \
            message.second = (double)(i & 15) * 0.05;                                                                  \
            oilspring_pack_##name(payloads[i & 255], &message);                                                        \
            oilspring_protect_##name(payloads[i & 255], (unsigned)(i % OILSPRING_##name##_COUNTER_MODULO));            \
        }                                                                                                              \
        packed = now();                                                                                                \
        for (i = 0; i < rounds; i += 1) {                                                                              \
            if (oilspring_verify_##name(payloads[i & 255]) >= 0)                                                       \
                oilspring_unpack_##name(&message, payloads[i & 255]);                                                  \
            sink = message.first;                                                                                      \
        }                                                                                                              \
        unpacked = now();                                                                                              \
        printf("\"%s\":[%.2f,%.2f]", #name, (packed - began) / (double)rounds, (unpacked - packed) / (double)rounds);  \
    } while (0)

int main(int count, char **words)
{
    long rounds = count > 1 ? atol(words[1]) : 1000000;
    printf("{");
    MEASURE(hydraulicStatus, highPressure, displacement);
    printf(",");
    MEASURE(vehicleStatus, speed, accelerator);
    printf("}\n");
    return 0;
}
