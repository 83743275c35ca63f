/*
 * The engine's generation step as a C program would do it: the same algorithm and the same operations in the same order
 * as sim/model, one thread, so that its checksums agree with the engine's to the last bit. Reads the input that
 * engine.ts writes: gcc -O3 -ffp-contract=off -o engine engine.c -lm; ./engine INPUT GENERATIONS CASE
 */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static double LOG_TABLE[516], EXP_TABLE[256], POWER_OF_TWO[2047];
static double LN2_HIGH, LN2_LOW, STEP_HIGH, STEP_LOW, PER_STEP;
static const double ROUND = 6755399441055744.0;

static inline double ln(double x) {
  uint64_t bits;
  memcpy(&bits, &x, 8);
  int32_t high = (int32_t)(bits >> 32);
  int k = (high >> 20) - 1023;
  int cell = ((high & 0xfffff) + 0x1000) >> 13;
  uint64_t mbits = (bits & 0xfffffffffffffULL) | 0x3ff0000000000000ULL;
  double m;
  memcpy(&m, &mbits, 8);
  if (cell >= 54) k++;
  const double *t = LOG_TABLE + 4 * cell;
  double d = m - t[0], r = d * t[1];
  double rh = r + 1.5 - 1.5, rl = (d - rh * t[0]) * t[1], r2 = r * r;
  double series = r2 * (-0.5 + r * 0.3333333333333333 +
                        r2 * (-0.25 + r * 0.2 + r2 * (-0.16666666666666666 + r * 0.14285714285714285 - r2 * 0.125)));
  double w = k * LN2_HIGH + t[2], sum = w + rh;
  return sum + (w - sum + rh + (k * LN2_LOW + t[3] + rl + series));
}

static inline double ex(double x) {
  double n = x * PER_STEP + ROUND - ROUND;
  int whole = (int)n;
  const double *t = EXP_TABLE + 2 * (whole & 127);
  double r = x - n * STEP_HIGH - n * STEP_LOW, r2 = r * r;
  double p = r + r2 * (0.5 + r * 0.16666666666666666 + r2 * (0.041666666666666664 + r * 0.008333333333333333));
  return (t[0] + (t[0] * p + t[1])) * POWER_OF_TWO[(whole >> 7) + 1023];
}

static double tail(double q, double u) {
  double r = sqrt(-ln(q < 0 ? u : 1 - u)), x;
  if (r <= 5) {
    r -= 1.6;
    x = (((((((r * 7.7454501427834140764e-4 + 0.0227238449892691845833) * r + 0.24178072517745061177) * r + 1.27045825245236838258) * r + 3.64784832476320460504) * r + 5.7694972214606914055) * r + 4.6303378461565452959) * r + 1.42343711074968357734) /
        (((((((r * 1.05075007164441684324e-9 + 5.475938084995344946e-4) * r + 0.0151986665636164571966) * r + 0.14810397642748007459) * r + 0.68976733498510000455) * r + 1.6763848301838038494) * r + 2.05319162663775882187) * r + 1);
  } else {
    r -= 5;
    x = (((((((r * 2.01033439929228813265e-7 + 2.71155556874348757815e-5) * r + 0.0012426609473880784386) * r + 0.026532189526576123093) * r + 0.29656057182850489123) * r + 1.7848265399172913358) * r + 5.4637849111641143699) * r + 6.6579046435011037772) /
        (((((((r * 2.04426310338993978564e-15 + 1.4215117583164458887e-7) * r + 1.8463183175100546818e-5) * r + 7.868691311456132591e-4) * r + 0.0148753612908506148525) * r + 0.13692988092273580531) * r + 0.59983220655588793769) * r + 1);
  }
  return q < 0 ? -x : x;
}

static inline double quantile(double u) {
  double q = u - 0.5;
  if (q <= 0.425 && q >= -0.425) {
    double r = 0.180625 - q * q;
    return (q * (((((((r * 2509.0809287301226727 + 33430.575583588128105) * r + 67265.770927008700853) * r + 45921.953931549871457) * r + 13731.693765509461125) * r + 1971.5909503065514427) * r + 133.14166789178437745) * r + 3.387132872796366608)) /
           (((((((r * 5226.495278852545925 + 28729.085735721942674) * r + 39307.89580009271061) * r + 21213.794301586595867) * r + 5394.1960214247511077) * r + 687.1870074920579083) * r + 42.313330701600911252) * r + 1);
  }
  return tail(q, u);
}

static inline double uniform(uint32_t high, uint32_t low) {
  return ((double)(high >> 6) * 67108864 + (double)(low >> 6) + 0.5) * 2.220446049250313e-16;
}

static void normals(uint32_t n, uint32_t generation, uint32_t purpose, uint32_t low, uint32_t high, double *out) {
  for (uint32_t i = 0; i < n; i += 2) {
    uint32_t c0 = i >> 1, c1 = generation, c2 = 0, c3 = purpose, k0 = low, k1 = high;
    for (int r = 0; r < 10; r++) {
      uint64_t p0 = (uint64_t)c0 * 0xd2511f53u, p1 = (uint64_t)c2 * 0xcd9e8d57u;
      c0 = (uint32_t)(p1 >> 32) ^ c1 ^ k0;
      c1 = (uint32_t)p1;
      c2 = (uint32_t)(p0 >> 32) ^ c3 ^ k1;
      c3 = (uint32_t)p0;
      k0 += 0x9e3779b9u;
      k1 += 0xbb67ae85u;
    }
    out[i] = quantile(uniform(c0, c1));
    if (i + 1 < n) out[i + 1] = quantile(uniform(c2, c3));
  }
}

/* the planned choice, threshold shape, concave technology with full depreciation: sim/model/planned.ts */
static double scale, alpha, sigma, eta, a[4], pi[4], slope, curvature, planned, investment;
static int M, met;

static inline double power_(double x, double y) { return ex(y * ln(x)); }
static inline double childWealth(double k) { return scale * power_(k, alpha) + 0 * k; }

static double evaluate(double k, double z, double y, double delta, int count) {
  double power = (alpha * (z - 0 * k)) / k, marginal = power + 0, bend = ((alpha - 1) * power) / (k * marginal);
  double bendSlope = bend * ((alpha - 2) / k - bend);
  double s = ex(-sigma * ln(z)), fall = (sigma * s) / z, fall2 = ((sigma + 1) * fall) / z;
  for (int m = 0; m < count; m++) {
    double above = z - a[m];
    if (!(above > 0)) {
      if (pi[m] == 0) continue;
      slope = INFINITY;
      curvature = 0;
      return k - y;
    }
    double term = pi[m] * ex(-eta * ln(above)), first = (eta * term) / above;
    s += term;
    fall += first;
    fall2 += ((eta + 1) * first) / above;
  }
  double p = ex(ln(delta * marginal * s) / -sigma), drop = (marginal * fall) / s, l = (drop - bend) / sigma;
  double l2 = (drop * (drop + bend) - (marginal * marginal * fall2) / s - bendSlope) / sigma;
  slope = 1 + p * l;
  curvature = p * (l * l + l2);
  return p - (y - k);
}

static double root(double low, double high, double atHigh, double y, double delta, int count) {
  double from = low, k = atHigh > 0 ? low + ((high - low) * (y - low)) / (y - low + atHigh) : 0.5 * (low + high);
  if (!(k > low && k < high)) k = 0.5 * (low + high);
  double last = high - low;
  for (int step = 0; step < 200; step++) {
    double value = evaluate(k, childWealth(k), y, delta, count);
    if (value == 0) return k;
    if (value < 0) low = k; else high = k;
    double move = -value / slope, bendBy = 1 - (0.5 * value * curvature) / (slope * slope);
    if (bendBy > 0.2 && bendBy < 5) move /= bendBy;
    double next = k + move;
    if (fabs(move) <= 1e-4 * fmin(k - from, y - k)) return next < low ? low : next > high ? high : next;
    if (!(next > low && next < high) || fabs(move) > 0.7 * last) {
      next = 0.5 * (low + high);
      move = next - k;
    }
    last = fabs(move);
    if (next == k || next <= low || next >= high) return k;
    k = next;
  }
  return k;
}

static inline double crra(double x) { return ex((1 - sigma) * ln(x)) / (1 - sigma); }

static double utility(double c, double z, double delta, int count) {
  double value = crra(z), power = 1 - eta;
  for (int m = 0; m < count; m++) {
    double above = z - a[m];
    if (above > 0) value += (pi[m] * ex(power * ln(above))) / power;
  }
  return crra(c) + delta * value;
}

static void solve(double y, double delta) {
  double reach = childWealth(y), best = -INFINITY, kLow = 0;
  for (int j = 0; j <= M; j++) {
    double lower = j > 0 ? a[j - 1] : 0, upper = j < M ? a[j] : INFINITY, kHigh = y, atHigh = 0;
    if (lower >= reach) break;
    if (!(upper > lower)) continue;
    if (upper < reach) {
      kHigh = power_(upper / scale, 1 / alpha);
      atHigh = evaluate(kHigh, upper, y, delta, j);
      if (atHigh < 0) {
        kLow = kHigh;
        continue;
      }
    }
    double k = root(kLow, kHigh, atHigh, y, delta, j), z = childWealth(k);
    if (z < lower) z = lower;
    int count = j;
    if (z >= upper) {
      z = upper;
      while (count < M && a[count] <= z) count++;
    }
    double u = utility(y - k, z, delta, j);
    if (u >= best) {
      best = u;
      planned = z;
      investment = k;
      met = count;
    }
    kLow = kHigh;
  }
}

static double now(void) {
  struct timespec t;
  /* processor time: what a busy machine takes from others does not count */
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return t.tv_sec + t.tv_nsec * 1e-9;
}

static void need(void *to, size_t size, size_t count, FILE *file) {
  if (fread(to, size, count, file) != count) exit(1);
}

int main(int argc, char **argv) {
  if (argc < 4) return 2;
  FILE *file = fopen(argv[1], "rb");
  if (!file) return 1;
  int generations = atoi(argv[2]), concave = strcmp(argv[3], "concave") == 0;
  double h[32];
  need(h, 8, 32, file);
  uint32_t n = (uint32_t)h[0], low = (uint32_t)h[2], high = (uint32_t)h[3];
  size_t ends = (size_t)h[1];
  double s = h[4], R = h[5], q = h[6], gLow = h[7], delta = h[9], own = h[10], other = h[11];
  int cells = (int)h[8];
  uint32_t purpose = (uint32_t)h[12];
  scale = h[13]; alpha = h[14]; sigma = eta = h[15];
  M = concave ? 2 : 1;
  double weight[2] = {h[16], h[17]}, scales[2] = {h[18], h[19]};
  LN2_HIGH = h[20]; LN2_LOW = h[21]; STEP_HIGH = h[22]; STEP_LOW = h[23]; PER_STEP = h[24];
  need(LOG_TABLE, 8, 516, file);
  need(EXP_TABLE, 8, 256, file);
  need(POWER_OF_TWO, 8, 2047, file);
  double *growth = malloc(8 * 6 * (size_t)(cells > 0 ? cells : 1));
  need(growth, 8, 6 * (size_t)cells, file);
  uint32_t *start = malloc(4 * ((size_t)n + 1)), *target = malloc(4 * ends);
  double *wealth = malloc(8 * (size_t)n);
  need(start, 4, (size_t)n + 1, file);
  need(target, 4, ends, file);
  need(wealth, 8, n, file);
  fclose(file);
  double *aspiration[2], *column = malloc(8 * (size_t)n), *k = malloc(8 * (size_t)n), *c = malloc(8 * (size_t)n);
  double *z = malloc(8 * (size_t)n), *shock = malloc(8 * (size_t)n), *child = malloc(8 * (size_t)n);
  uint8_t *metColumn = malloc(n), *reached = malloc(n), *isolated = malloc(n);
  for (int m = 0; m < 2; m++) aspiration[m] = malloc(8 * (size_t)n);
  /* touched once before the clock starts, as the engine's columns are */
  double *columns[] = {aspiration[0], aspiration[1], column, k, c, z, shock, child};
  for (int j = 0; j < 8; j++) memset(columns[j], 0, 8 * (size_t)n);
  memset(metColumn, 0, n); memset(reached, 0, n);

  double began = now();
  for (int t = 0; t < generations; t++) {
    memset(isolated, 0, n);
    if (concave) {
      for (uint32_t i = 0; i < n; i++) {
        double mine = wealth[i], sum = 0, count = 0;
        for (uint32_t e = start[i]; e < start[i + 1]; e++) {
          double y = wealth[target[e]], richer = y > mine ? 1 : 0;
          sum += richer * y;
          count += richer;
        }
        column[i] = count > 0 ? sum / count : mine;
        if (start[i] == start[i + 1]) isolated[i] = 1;
      }
    } else {
      for (uint32_t i = 0; i < n; i++) {
        double sum = 0;
        for (uint32_t e = start[i]; e < start[i + 1]; e++) sum += wealth[target[e]];
        if (start[i + 1] > start[i]) column[i] = sum / (start[i + 1] - start[i]);
        else { column[i] = wealth[i]; isolated[i] = 1; }
      }
    }
    for (int m = 0; m < M; m++)
      for (uint32_t i = 0; i < n; i++) aspiration[m][i] = scales[m] * (own * wealth[i] + 0 + other * column[i]);
    if (concave) {
      for (uint32_t i = 0; i < n; i++) {
        int swap = aspiration[0][i] > aspiration[1][i];
        a[0] = aspiration[swap][i]; a[1] = aspiration[1 - swap][i];
        pi[0] = weight[swap]; pi[1] = weight[1 - swap];
        solve(wealth[i], delta);
        z[i] = planned; k[i] = investment; metColumn[i] = (uint8_t)met;
      }
    } else {
      for (uint32_t i = 0; i < n; i++) {
        double y = wealth[i], aim = aspiration[0][i], ratio = aim / y, plan;
        if (ratio > q) { plan = gLow * y; metColumn[i] = 0; }
        else {
          double position = ((ratio > 0 ? ratio : 0) / q) * cells;
          int cell = (int)position;
          if (cell >= cells) cell = cells - 1;
          double x = position - cell;
          const double *p = growth + 6 * cell;
          plan = (p[0] + x * (p[1] + x * (p[2] + x * (p[3] + x * (p[4] + x * p[5]))))) * y;
          if (plan < aim) plan = aim;
          metColumn[i] = 1;
        }
        z[i] = plan;
        k[i] = plan / R;
      }
    }
    normals(n, (uint32_t)t, purpose, low, high, shock);
    for (uint32_t i = 0; i < n; i++) shock[i] = ex(s * shock[i] + -0.5 * s * s);
    for (uint32_t i = 0; i < n; i++) {
      c[i] = wealth[i] - k[i];
      child[i] = z[i] * shock[i];
      reached[i] = child[i] >= aspiration[0][i];
    }
    for (int m = 1; m < M; m++)
      for (uint32_t i = 0; i < n; i++) reached[i] += child[i] >= aspiration[m][i];
    memcpy(wealth, child, 8 * (size_t)n);
  }
  double seconds = now() - began, sum = 0;
  long unmet = 0, hits = 0;
  for (uint32_t i = 0; i < n; i++) {
    sum += child[i] + c[i];
    unmet += metColumn[i] == 0;
    hits += reached[i] + isolated[i];
  }
  printf("{\"seconds\": %.6f, \"sum\": %.17g, \"unmet\": %ld, \"reached\": %ld}\n", seconds, sum, unmet, hits);
  return 0;
}
