// The lattice in plain C, to measure the kernel against: passive and active struts, ground, contact, friction and
// symplectic Euler, the same algebra as sim/lattice/reference (angle addition, square root and division independent).
// Compiled on the spot (compile.ts), once for every variant:
//
//   DIM    2 or 3
//   NUM    double or float
//   BYTES  0: one replicate, plain numbers; 16 or 32: two vectors of that size side by side, a replicate in every lane
//
// Talks in lines: "load FILE" reads a body, "run STEPS" moves it and answers with nanoseconds of CPU of this thread,
// "state" answers with the places of all nodes of every replicate.

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#if defined(__x86_64__)
#include <immintrin.h>
#endif


typedef NUM num;
#define IS_DOUBLE (sizeof(num) == 8)
#if BYTES == 0
#define VECTORS 1
#define WIDTH 1
typedef num vec;
typedef int mask;
#else
#define VECTORS 2
#define WIDTH ((int)(BYTES / sizeof(num)))
typedef num vec __attribute__((vector_size(BYTES)));
#define double_mask int64_t
#define float_mask int32_t
#define MASK2(n) n##_mask
#define MASK1(n) MASK2(n)
typedef MASK1(NUM) mask __attribute__((vector_size(BYTES)));
#endif
#define LANES (VECTORS * WIDTH)

#if BYTES == 0
static inline vec all(num a) { return a; }
static inline vec root(vec a) { return IS_DOUBLE ? (num)sqrt(a) : (num)sqrtf(a); }
static inline vec lower(vec a) { return IS_DOUBLE ? (num)floor(a) : (num)floorf(a); }
static inline int any(mask m) { return m; }
static inline vec pick(mask m, vec yes, vec no) { return m ? yes : no; }
static inline num lane(vec a, int i) { (void)i; return a; }
static inline void setLane(vec *a, int i, num value) { (void)i; *a = value; }
#else
static inline vec all(num a) {
  vec r;
  for (int i = 0; i < WIDTH; i++) r[i] = a;
  return r;
}
static inline num lane(vec a, int i) { return a[i]; }
static inline void setLane(vec *a, int i, num value) { (*a)[i] = value; }
static inline vec pick(mask m, vec yes, vec no) { return (vec)((m & (mask)yes) | (~m & (mask)no)); }
#if defined(__x86_64__) && BYTES == 16
static inline vec root(vec a) { return IS_DOUBLE ? (vec)_mm_sqrt_pd((__m128d)a) : (vec)_mm_sqrt_ps((__m128)a); }
static inline vec lower(vec a) { return IS_DOUBLE ? (vec)_mm_floor_pd((__m128d)a) : (vec)_mm_floor_ps((__m128)a); }
static inline int any(mask m) { return _mm_movemask_epi8((__m128i)m) != 0; }
#elif defined(__x86_64__)
static inline vec root(vec a) { return IS_DOUBLE ? (vec)_mm256_sqrt_pd((__m256d)a) : (vec)_mm256_sqrt_ps((__m256)a); }
static inline vec lower(vec a) { return IS_DOUBLE ? (vec)_mm256_floor_pd((__m256d)a) : (vec)_mm256_floor_ps((__m256)a); }
static inline int any(mask m) { return _mm256_movemask_epi8((__m256i)m) != 0; }
#else
static inline vec root(vec a) {
  for (int i = 0; i < WIDTH; i++) a[i] = IS_DOUBLE ? (num)sqrt(a[i]) : (num)sqrtf(a[i]);
  return a;
}
static inline vec lower(vec a) {
  for (int i = 0; i < WIDTH; i++) a[i] = IS_DOUBLE ? (num)floor(a[i]) : (num)floorf(a[i]);
  return a;
}
static inline int any(mask m) {
  for (int i = 0; i < WIDTH; i++) if (m[i]) return 1;
  return 0;
}
#endif
#endif
static inline vec atMost(vec a, vec limit) { return pick(limit < a, limit, a); }
static inline vec atLeast(vec a, vec limit) { return pick(a < limit, limit, a); }

// One record a node, one a strut; every quantity that differs between replicates is VECTORS wide.
typedef struct { vec p[DIM][VECTORS], v[DIM][VECTORS], f[DIM][VECTORS]; } Node;
typedef struct { num perKg; vec friction[DIM][VECTORS]; } Row;
typedef struct { int a, b; num k, kRest, c; } Passive;
typedef struct { int a, b; num k, kRest, c, limit, power; vec strainCos[VECTORS], strainSin[VECTORS]; } Active;

static int nodeCount, passiveCount, activeCount, columns, rows, rooted, since;
static Node *nodes;
static Row *table;
static Passive *passive;
static Active *active;
static num *heights;
static num h, drag, gravity[3], terrain[5], contact[2];
static double angular;
static double rotorS, rotorC, turnS, turnC;


#define DOT(a, b) (DIM == 3 ? a[0] * b[0] + a[1] * b[1] + a[DIM - 1] * b[DIM - 1] : a[0] * b[0] + a[1] * b[1])

static inline void pull(Node *a, Node *b, int w, vec scale, const vec *d) {
  for (int i = 0; i < DIM; i++) {
    vec force = scale * d[i];
    a->f[i][w] += force;
    b->f[i][w] -= force;
  }
}

static void addPassive(void) {
  for (int n = 0; n < passiveCount; n++) {
    const Passive *s = &passive[n];
    Node *a = &nodes[s->a], *b = &nodes[s->b];
    for (int w = 0; w < VECTORS; w++) {
      vec d[DIM], dv[DIM];
      for (int i = 0; i < DIM; i++) d[i] = b->p[i][w] - a->p[i][w];
      for (int i = 0; i < DIM; i++) dv[i] = b->v[i][w] - a->v[i][w];
      vec q = DOT(d, d);
      vec scale = s->k + (s->c * DOT(d, dv) - s->kRest * root(q)) * (1 / q);
      pull(a, b, w, scale, d);
    }
  }
}

static void addActive(void) {
  const num sine = (num)rotorS, cosine = (num)rotorC;
  for (int n = 0; n < activeCount; n++) {
    const Active *s = &active[n];
    Node *a = &nodes[s->a], *b = &nodes[s->b];
    for (int w = 0; w < VECTORS; w++) {
      vec d[DIM], dv[DIM];
      for (int i = 0; i < DIM; i++) d[i] = b->p[i][w] - a->p[i][w];
      for (int i = 0; i < DIM; i++) dv[i] = b->v[i][w] - a->v[i][w];
      vec q = DOT(d, d);
      vec perQ = 1 / q;
      vec perLength = root(q) * perQ;
      vec drive = sine * s->strainCos[w] + cosine * s->strainSin[w];
      vec most = s->limit * perLength;
      vec along = DOT(d, dv);
      vec free = s->k - s->kRest * (1 + drive) * perLength + s->c * along * perQ;
      vec scale = atMost(atLeast(free, -most), most);
      vec power = -scale * along;
      mask over = power > all(s->power);
      if (any(over)) scale = pick(over, scale * (s->power / power), scale);
      pull(a, b, w, scale, d);
    }
  }
}

static inline vec cellOf(vec along, int count) {
  vec last = all((num)(count - 2));
  return pick(along > all(0), pick(along < last, lower(along), last), all(0));
}
static inline vec gather(vec place, int offset) {
  vec r = all(0);
  for (int i = 0; i < WIDTH; i++) setLane(&r, i, heights[(int)lane(place, i) + offset]);
  return r;
}

// Depth, slopes of the ground under a node.
static inline vec under(const Node *o, int w, vec *slope) {
  vec along = (o->p[0][w] - terrain[0]) * terrain[1];
  vec column = cellOf(along, columns);
  vec u = along - column;
#if DIM == 2
  vec left = gather(column, 0);
  vec rise = gather(column, 1) - left;
  slope[0] = rise * terrain[1];
  return left + rise * u - o->p[1][w];
#else
  vec across = (o->p[2][w] - terrain[3]) * terrain[4];
  vec row = cellOf(across, rows);
  vec corner = row * (num)columns + column;
  vec near = gather(corner, 0), far = gather(corner, columns);
  vec nearRise = gather(corner, 1) - near, farRise = gather(corner, columns + 1) - far;
  vec t = across - row;
  vec nearHeight = near + nearRise * u;
  vec side = far + farRise * u - nearHeight;
  slope[0] = (nearRise + (farRise - nearRise) * t) * terrain[1];
  slope[1] = side * terrain[4];
  return nearHeight + side * t - o->p[1][w];
#endif
}

static const num tiny = sizeof(num) == 8 ? (num)1e-200 : (num)1e-30;

#if DIM == 2
static void touch(Node *o, const Row *row, int w) {
  vec slope[1];
  vec depth = under(o, w, slope);
  vec s = slope[0];
  vec fx = o->f[0][w] - drag * o->v[0][w], fy = o->f[1][w] - drag * o->v[1][w];
  vec power = rooted ? depth * root(depth) : depth;
  vec f = power * (contact[0] + contact[1] * (s * o->v[0][w] - o->v[1][w]));
  mask pushed = (depth > all(0)) & (f > all(0));
  fx = pick(pushed, fx - f * s, fx);
  fy = pick(pushed, fy + f, fy);
  vec vx = o->v[0][w] + h * (fx * row->perKg + gravity[0]);
  vec vy = o->v[1][w] + h * (fy * row->perKg + gravity[1]);
  if (any(pushed)) {
    vec squared = 1 + s * s;
    vec perLength = 1 / squared;
    vec sliding = vx + s * vy;
    vec mu = pick(sliding > all(0), row->friction[0][w], row->friction[1][w]);
    vec speed = root(sliding * sliding * perLength) + tiny;
    vec drop = h * mu * f * root(squared) * row->perKg;
    vec change = -atMost(drop / speed, all(1)) * sliding * perLength;
    vx = pick(pushed, vx + change, vx);
    vy = pick(pushed, vy + change * s, vy);
  }
  o->v[0][w] = vx;
  o->v[1][w] = vy;
  o->p[0][w] += h * vx;
  o->p[1][w] += h * vy;
}
#else
static void touch(Node *o, const Row *row, int w) {
  vec slope[2];
  vec depth = under(o, w, slope);
  mask inside = depth > all(0);
  vec sx = pick(inside, slope[0], all(0)), sz = pick(inside, slope[1], all(0));
  vec power = rooted ? depth * root(depth) : depth;
  vec rate = sx * o->v[0][w] + sz * o->v[2][w] - o->v[1][w];
  vec f = pick(inside, atLeast(power * (contact[0] + contact[1] * rate), all(0)), all(0));
  mask pushed = f > all(0);
  vec vx = o->v[0][w] + h * ((o->f[0][w] - drag * o->v[0][w] - f * sx) * row->perKg + gravity[0]);
  vec vy = o->v[1][w] + h * ((o->f[1][w] - drag * o->v[1][w] + f) * row->perKg + gravity[1]);
  vec vz = o->v[2][w] + h * ((o->f[2][w] - drag * o->v[2][w] - f * sz) * row->perKg + gravity[2]);
  if (any(pushed)) {
    // Friction is the same in all directions here.
    vec squared = 1 + sx * sx + sz * sz;
    vec lift = (vy - sx * vx - sz * vz) / squared;
    vec tx = vx + lift * sx, ty = vy - lift, tz = vz + lift * sz;
    vec speed = root(tx * tx + ty * ty + tz * tz) + tiny;
    vec drop = h * row->friction[0][w] * (f * root(squared)) * row->perKg;
    vec change = pick(pushed, atMost(drop / speed, all(1)), all(0));
    vx -= change * tx;
    vy -= change * ty;
    vz -= change * tz;
  }
  o->v[0][w] = vx;
  o->v[1][w] = vy;
  o->v[2][w] = vz;
  o->p[0][w] += h * vx;
  o->p[1][w] += h * vy;
  o->p[2][w] += h * vz;
}
#endif

static void integrate(void) {
  for (int n = 0; n < nodeCount; n++) {
    Node *o = &nodes[n];
    const Row *row = &table[n];
    for (int w = 0; w < VECTORS; w++) {
      if (row->perKg == 0) {
        for (int i = 0; i < DIM; i++) o->f[i][w] = all(0);
        continue;
      }
      if (any(o->p[1][w] < all(terrain[2]))) {
        touch(o, row, w);
      } else {
        for (int i = 0; i < DIM; i++) {
          vec v = o->v[i][w] + h * ((o->f[i][w] - drag * o->v[i][w]) * row->perKg + gravity[i]);
          o->v[i][w] = v;
          o->p[i][w] += h * v;
        }
      }
      for (int i = 0; i < DIM; i++) o->f[i][w] = all(0);
    }
  }
}

static void turn(void) {
  since++;
  if (since % 256 == 0) {
    rotorS = sin(angular * since * h);
    rotorC = cos(angular * since * h);
  } else {
    double s = rotorS * turnC + rotorC * turnS;
    rotorC = rotorC * turnC - rotorS * turnS;
    rotorS = s;
  }
}

static double next(FILE *file) {
  double value;
  if (fread(&value, 8, 1, file) != 1) exit(2);
  return value;
}
static void *room(size_t bytes) {
  void *p = aligned_alloc(64, (bytes + 63) / 64 * 64);
  if (!p) exit(3);
  memset(p, 0, bytes);
  return p;
}

/* The file: doubles in the order read here (bodies.ts). Replicates beyond those in the file repeat them. */
static void readBody(const char *name) {
  FILE *file = fopen(name, "rb");
  if (!file) exit(1);
  int given = (int)next(file);
  nodeCount = (int)next(file);
  passiveCount = (int)next(file);
  activeCount = (int)next(file);
  columns = (int)next(file);
  rows = (int)next(file);
  rooted = next(file) != 0;
  h = (num)next(file);
  drag = (num)next(file);
  angular = next(file);
  for (int i = 0; i < DIM; i++) gravity[i] = (num)next(file);
  for (int i = 0; i < 5; i++) terrain[i] = (num)next(file);
  for (int i = 0; i < 2; i++) contact[i] = (num)next(file);
  heights = room(columns * rows * sizeof(num));
  for (int i = 0; i < columns * rows; i++) heights[i] = (num)next(file);
  nodes = room(nodeCount * sizeof(Node));
  table = room(nodeCount * sizeof(Row));
  passive = room(passiveCount * sizeof(Passive));
  active = room(activeCount * sizeof(Active));
  for (int n = 0; n < nodeCount; n++) table[n].perKg = (num)next(file);
  for (int n = 0; n < passiveCount + activeCount; n++) {
    int a = (int)next(file), b = (int)next(file);
    num k = (num)next(file), kRest = (num)next(file), c = (num)next(file);
    num limit = (num)next(file), power = (num)next(file);
    if (n < passiveCount) passive[n] = (Passive){a, b, k, kRest, c};
    else active[n - passiveCount] =
      (Active){.a = a, .b = b, .k = k, .kRest = kRest, .c = c, .limit = limit, .power = power};
  }
  long start = ftell(file);
  int each = nodeCount * 3 * DIM + 2 * activeCount;
  for (int l = 0; l < LANES; l++) {
    fseek(file, start + 8L * each * (l % given), SEEK_SET);
    int w = l / WIDTH, i = l % WIDTH;
    for (int n = 0; n < nodeCount; n++) {
      for (int axis = 0; axis < DIM; axis++) setLane(&nodes[n].p[axis][w], i, (num)next(file));
      for (int axis = 0; axis < DIM; axis++) setLane(&nodes[n].v[axis][w], i, (num)next(file));
      for (int axis = 0; axis < DIM; axis++) setLane(&table[n].friction[axis][w], i, (num)next(file));
    }
    for (int n = 0; n < activeCount; n++) {
      setLane(&active[n].strainCos[w], i, (num)next(file));
      setLane(&active[n].strainSin[w], i, (num)next(file));
    }
  }
  fclose(file);
  rotorS = 0;
  rotorC = 1;
  turnS = sin(angular * h);
  turnC = cos(angular * h);
}

int main(void) {
  char line[4096];
  while (fgets(line, sizeof line, stdin)) {
    line[strcspn(line, "\n")] = 0;
    if (strncmp(line, "load ", 5) == 0) {
      readBody(line + 5);
      printf("%d\n", LANES);
    } else if (strncmp(line, "run ", 4) == 0) {
      struct timespec from, to;
      int steps = atoi(line + 4);
      clock_gettime(CLOCK_THREAD_CPUTIME_ID, &from);
      for (int i = 0; i < steps; i++) {
        addPassive();
        addActive();
        integrate();
        turn();
      }
      clock_gettime(CLOCK_THREAD_CPUTIME_ID, &to);
      printf("%.0f\n", (to.tv_sec - from.tv_sec) * 1e9 + (double)(to.tv_nsec - from.tv_nsec));
    } else if (strcmp(line, "state") == 0) {
      for (int l = 0; l < LANES; l++)
        for (int n = 0; n < nodeCount; n++)
          for (int axis = 0; axis < DIM; axis++) printf("%.17g ", (double)lane(nodes[n].p[axis][l / WIDTH], l % WIDTH));
      printf("\n");
    }
    fflush(stdout);
  }
  return 0;
}
