/* Peak of a BLAS at one matrix order on this cpu: `blas ORDER ROUNDS` prints "dgemm flop/s" and "sgemm flop/s".
 *
 * C = A B without transposition, alpha 1, beta 0, the same matrices again and again, so that they are in the caches.
 * Of many short bursts the one counts that only one in fifty beat, as in kernels/benches/ratio.rs. */
#define _POSIX_C_SOURCE 199309L
#include <cblas.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static double now(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return t.tv_sec + 1e-9 * t.tv_nsec;
}

static int by_size(const void *a, const void *b) {
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

#define MEASURE(real, gemm, name)                                                                                      \
    static void name(int n, int rounds) {                                                                              \
        real *a = aligned_alloc(64, sizeof(real) * n * n), *b = aligned_alloc(64, sizeof(real) * n * n),               \
             *c = aligned_alloc(64, sizeof(real) * n * n);                                                             \
        double *times = malloc(sizeof(double) * rounds), flop = 2.0 * n * n * n;                                       \
        int calls = 1 + (int)(8e6 / flop);                                                                             \
        for (int i = 0; i < n * n; i++) {                                                                              \
            a[i] = (real)rand() / RAND_MAX - (real)0.5;                                                                \
            b[i] = (real)rand() / RAND_MAX - (real)0.5;                                                                \
        }                                                                                                              \
        for (int r = 0; r < rounds; r++) {                                                                             \
            double start = now();                                                                                      \
            for (int i = 0; i < calls; i++)                                                                            \
                gemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, n, n, n, 1, a, n, b, n, 0, c, n);                      \
            times[r] = (now() - start) / calls;                                                                        \
        }                                                                                                              \
        qsort(times, rounds, sizeof(double), by_size);                                                                 \
        printf(#gemm " %.6e\n", flop / times[rounds / 50]);                                                            \
    }

MEASURE(double, cblas_dgemm, measure_double)
MEASURE(float, cblas_sgemm, measure_single)

int main(int argc, char **argv) {
    if (argc != 3) return 2;
    int n = atoi(argv[1]), rounds = atoi(argv[2]);
    measure_double(n, rounds);
    measure_single(n, rounds);
    return 0;
}
