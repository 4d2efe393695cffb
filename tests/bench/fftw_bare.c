/* The yardstick: what a general-purpose C transform library (FFTW 3, single precision, planned,
 * one thread) needs for the bare transforms of one 1024 x 1024 pair, and nothing else.
 *
 * Work: 31 x 31 windows of 64 px, then twice 63 x 63 windows of 32 px (passes 64, 32, 32 at overlap
 * 0.5). A window pair is two forward real-to-complex and one inverse complex-to-real 2-D transform.
 * No gathering, no product, no peaks. Two arrangements:
 *   single   one window at a time in buffers that stay in the nearest cache (kindest to the library);
 *   batched  16 windows interleaved element by element, planned as one batch.
 *
 * Only the benchmark uses this library; nothing in kolk is built with it.
 *   cc -O3 -o /tmp/fftw_bare fftw_bare.c -lfftw3f -lm && taskset -c 0 /tmp/fftw_bare [patient] [repeats]
 */
#include <fftw3.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static double milliseconds(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return 1e3 * (double)t.tv_sec + 1e-6 * (double)t.tv_nsec;
}

struct plans {
    int n, batch;
    float *real;
    fftwf_complex *spectrum;
    fftwf_plan forward, inverse;
};

static struct plans prepare(int n, int batch, unsigned effort) {
    int shape[2] = {n, n};
    struct plans p = {.n = n, .batch = batch};
    size_t reals = (size_t)n * n * batch, bins = (size_t)n * (n / 2 + 1) * batch;
    p.real = fftwf_malloc(sizeof(float) * reals);
    p.spectrum = fftwf_malloc(sizeof(fftwf_complex) * bins);
    p.forward = fftwf_plan_many_dft_r2c(2, shape, batch, p.real, NULL, batch, 1, p.spectrum, NULL,
                                        batch, 1, effort);
    p.inverse = fftwf_plan_many_dft_c2r(2, shape, batch, p.spectrum, NULL, batch, 1, p.real, NULL,
                                        batch, 1, effort);
    for (size_t i = 0; i < reals; i++) p.real[i] = (float)rand() / (float)RAND_MAX - 0.5f;
    return p;
}

/* Windows between two readings of the clock. */
enum { CHUNK = 16 };

/* Time of `windows` window pairs: the least over `repeats` of each chunk of them, added up, so that
 * other programs on the machine disturb little. */
static double transform(struct plans *p, int windows, int repeats) {
    size_t reals = (size_t)p->n * p->n * p->batch;
    int chunks = (windows + CHUNK - 1) / CHUNK;
    double *least = malloc(sizeof(double) * chunks), sum = 0;
    for (int c = 0; c < chunks; c++) least[c] = 1e9;
    for (int r = 0; r < repeats; r++) {
        for (int c = 0; c < chunks; c++) {
            int share = c + 1 < chunks ? CHUNK : windows - c * CHUNK;
            if (p->batch > 1) share = (share + p->batch - 1) / p->batch;
            double start = milliseconds(), paused = 0;
            for (int w = 0; w < share; w++) {
                fftwf_execute(p->forward);
                fftwf_execute(p->forward);
                fftwf_execute(p->inverse);
                /* The inverse multiplies by n*n: refill now and then, outside the clock, so that the
                 * data stay ordinary numbers. */
                if (w % 4 == 3 || w + 1 == share) {
                    double pause = milliseconds();
                    for (size_t i = 0; i < reals; i++)
                        p->real[i] = (float)((i * 2654435761u) >> 8 & 0xff) / 256.0f - 0.5f;
                    paused += milliseconds() - pause;
                }
            }
            double time = milliseconds() - start - paused;
            if (time < least[c]) least[c] = time;
        }
    }
    for (int c = 0; c < chunks; c++) sum += least[c];
    free(least);
    return sum;
}

int main(int argc, char **argv) {
    unsigned effort = FFTW_MEASURE;
    int repeats = 20;
    for (int i = 1; i < argc; i++) {
        if (!strcmp(argv[i], "patient")) effort = FFTW_PATIENT;
        else repeats = atoi(argv[i]);
    }
    const int batches[2] = {1, 16};
    const char *names[2] = {"single", "batched"};
    for (int kind = 0; kind < 2; kind++) {
        struct plans large = prepare(64, batches[kind], effort);
        struct plans small = prepare(32, batches[kind], effort);
        double l = transform(&large, 31 * 31, repeats);
        double m = transform(&small, 63 * 63, repeats), n = transform(&small, 63 * 63, repeats);
        printf("fftw %s: 64 px %.2f us, 32 px %.2f us a window pair, total %.2f ms\n", names[kind],
               1e3 * l / (31 * 31), 1e3 * (m < n ? m : n) / (63 * 63), l + m + n);
    }
    return 0;
}
