// The kernel's computation in C, for the benchmark: two arms of lossless rings, both outputs as complex fields.
// Usage: kernel rounds points armPhase0 armPhase1 rings K... phi...   (half of the rings on each arm)
// Prints the least and the median time in microseconds, then the sums of the four field parts.
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#define BLOCK 256

static double now(void) {
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return t.tv_sec * 1e6 + t.tv_nsec * 1e-3;
}

static int ascending(const void *a, const void *b) {
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static void arm(int n, const double *restrict c, const double *restrict s, int rings, const double *k,
                const double *phi, double phase, double *restrict re, double *restrict im) {
  double pRe[BLOCK], pIm[BLOCK];
  for (int i = 0; i < n; i++) {
    pRe[i] = 1;
    pIm[i] = 0;
  }
  for (int r = 0; r < rings; r++) {
    double t = sqrt(1 - k[r]), q = k[r] / (1 + t), ch = cos(phi[r] / 2), sh = sin(phi[r] / 2);
    double m0 = q * ch, m1 = q * sh, m2 = (1 + t) * ch, m3 = (1 + t) * sh;
    for (int i = 0; i < n; i++) {
      double bRe = m0 * c[i] - m1 * s[i], bIm = m2 * s[i] + m3 * c[i];
      double next = pRe[i] * bRe - pIm[i] * bIm;
      pIm[i] = pRe[i] * bIm + pIm[i] * bRe;
      pRe[i] = next;
    }
  }
  double sign = rings % 2 ? -1 : 1, aRe = cos(phase), aIm = -sin(phase);
  for (int i = 0; i < n; i++) {
    double rr = pRe[i] * pRe[i], ii = pIm[i] * pIm[i], norm = sign / (rr + ii);
    double qRe = (rr - ii) * norm, qIm = -2 * pRe[i] * pIm[i] * norm;
    re[i] = aRe * qRe - aIm * qIm;
    im[i] = aRe * qIm + aIm * qRe;
  }
}

static void fields(int n, const double *omega, int rings, const double *k, const double *phi, const double *phase,
                   double *o1r, double *o1i, double *o2r, double *o2i) {
  double c[BLOCK], s[BLOCK], a0r[BLOCK], a0i[BLOCK], a1r[BLOCK], a1i[BLOCK];
  int half = rings / 2;
  for (int at = 0; at < n; at += BLOCK) {
    int m = n - at < BLOCK ? n - at : BLOCK;
    for (int i = 0; i < m; i++) c[i] = cos(omega[at + i] / 2);
    for (int i = 0; i < m; i++) s[i] = sin(omega[at + i] / 2);
    arm(m, c, s, half, k, phi, phase[0], a0r, a0i);
    arm(m, c, s, rings - half, k + half, phi + half, phase[1], a1r, a1i);
    for (int i = 0; i < m; i++) {
      o1r[at + i] = 0.5 * (a0r[i] - a1r[i]);
      o1i[at + i] = 0.5 * (a0i[i] - a1i[i]);
      o2r[at + i] = 0.5 * (a0i[i] + a1i[i]);
      o2i[at + i] = -0.5 * (a0r[i] + a1r[i]);
    }
  }
}

int main(int argc, char **argv) {
  if (argc < 6) return 1;
  int rounds = atoi(argv[1]), n = atoi(argv[2]), rings = atoi(argv[5]);
  double phase[2] = {atof(argv[3]), atof(argv[4])};
  if (argc < 6 + 2 * rings || rounds < 1 || n < 2) return 1;
  double *k = malloc(rings * sizeof *k), *phi = malloc(rings * sizeof *phi), *times = malloc(rounds * sizeof *times);
  double *omega = malloc(n * sizeof *omega), *out = malloc(4 * n * sizeof *out);
  for (int r = 0; r < rings; r++) {
    k[r] = atof(argv[6 + r]);
    phi[r] = atof(argv[6 + rings + r]);
  }
  for (int i = 0; i < n; i++) omega[i] = -M_PI + 2 * M_PI * i / (n - 1);
  for (int round = 0; round < rounds; round++) {
    double start = now();
    fields(n, omega, rings, k, phi, phase, out, out + n, out + 2 * n, out + 3 * n);
    times[round] = now() - start;
  }
  qsort(times, rounds, sizeof *times, ascending);
  printf("%.3f %.3f", times[0], times[rounds / 2]);
  for (int part = 0; part < 4; part++) {
    double sum = 0;
    for (int i = 0; i < n; i++) sum += out[part * n + i];
    printf(" %.12g", sum);
  }
  printf("\n");
  return 0;
}
