/*
 * Solves a circuit that oilspring printed (`check --code c`) by CVODE at a tolerance of 1e-9, with its exact Jacobian.
 * PRINTED is that file. Memory changes where the bench changes it: when commands are new, and at the end of each substep.
 *
 *   printed INPUT OUTPUT
 *
 * Input: `r step substeps`, `y i value` (start), `m i value latches` (start; whether a change makes the solver start anew),
 * `o i` (readings to write), `t` (a tick begins), `c i value` (a command that changed at the start of that tick).
 */
#include PRINTED

#include <cvode/cvode.h>
#include <nvector/nvector_serial.h>
#include <stdio.h>
#include <sunlinsol/sunlinsol_dense.h>
#include <sunmatrix/sunmatrix_dense.h>

static double u[OILSPRING_COMMANDS + 1], m[OILSPRING_MEMORY + 1], rates_out[OILSPRING_RATES], values[OILSPRING_JACOBIAN + 1];
static double observed[OILSPRING_OBSERVED];
static int latches[OILSPRING_MEMORY + 1], wanted[OILSPRING_OBSERVED], wanted_count;

static int rates(double t, N_Vector y, N_Vector slope, void *unused) {
  (void)t, (void)unused;
  oilspring_rates(N_VGetArrayPointer(y), u, m, N_VGetArrayPointer(slope));
  return 0;
}
static int slopes(double t, N_Vector y, N_Vector fy, SUNMatrix a, void *unused, N_Vector x1, N_Vector x2, N_Vector x3) {
  (void)t, (void)fy, (void)unused, (void)x1, (void)x2, (void)x3;
  oilspring_rates_and_jacobian(N_VGetArrayPointer(y), u, m, rates_out, values);
  SUNMatZero(a);
  for (int i = 0; i < OILSPRING_JACOBIAN; i++) SM_ELEMENT_D(a, oilspring_rows[i], oilspring_columns[i]) = values[i];
  return 0;
}
/* says whether a latch has moved */
static int take_memory(const double *y, double length) {
  double next_memory[OILSPRING_MEMORY + 1];
  int moved = 0;
  oilspring_update(y, u, m, length, next_memory);
  for (int i = 0; i < OILSPRING_MEMORY; i++) {
    if (latches[i] && next_memory[i] != m[i]) moved = 1;
    m[i] = next_memory[i];
  }
  return moved;
}
static void must(int flag, const char *what) {
  if (flag >= 0) return;
  fprintf(stderr, "printed: %s: CVODE says %d\n", what, flag);
  _Exit(1);
}

int main(int count, char **words) {
  FILE *in = count == 3 ? fopen(words[1], "r") : NULL, *out = in ? fopen(words[2], "wb") : NULL;
  if (!out) return fprintf(stderr, "printed INPUT OUTPUT\n"), 2;
  SUNContext context;
  SUNContext_Create(NULL, &context);
  N_Vector state = N_VNew_Serial(OILSPRING_STATES, context), tolerance = N_VNew_Serial(OILSPRING_STATES, context);
  double *y = N_VGetArrayPointer(state), step = 0, value;
  int substeps = 0, i, flag;
  char line[200];
  while (fgets(line, sizeof line, in) && line[0] != 't') {
    if (sscanf(line, "r %lf %d", &value, &i) == 2) step = value, substeps = i;
    else if (sscanf(line, "y %d %lf", &i, &value) == 2) y[i] = value;
    else if (sscanf(line, "m %d %lf %d", &i, &value, &flag) == 3) m[i] = value, latches[i] = flag;
    else if (sscanf(line, "o %d", &i) == 1) wanted[wanted_count++] = i;
  }
  for (i = 0; i < OILSPRING_STATES; i++) N_VGetArrayPointer(tolerance)[i] = 1e-9 * fmax(fabs(y[i]), 0.1);
  void *solver = CVodeCreate(CV_BDF, context);
  SUNMatrix matrix = SUNDenseMatrix(OILSPRING_STATES, OILSPRING_STATES, context);
  SUNLinearSolver linear = SUNLinSol_Dense(state, matrix, context);
  must(CVodeInit(solver, rates, 0, state), "start");
  must(CVodeSVtolerances(solver, 1e-9, tolerance), "tolerances");
  must(CVodeSetLinearSolver(solver, linear, matrix), "linear solver");
  must(CVodeSetJacFn(solver, slopes), "Jacobian");
  must(CVodeSetMaxNumSteps(solver, 200000), "steps");
  long tick = 0;
  int pending = 1;
  /* `line` holds the t of the first tick */
  for (int more = 1; more; tick++) {
    int jumped = pending;
    while ((more = fgets(line, sizeof line, in) != NULL) && line[0] != 't')
      if (sscanf(line, "c %d %lf", &i, &value) == 2) u[i] = value, jumped = 1;
    jumped |= take_memory(y, 0);
    for (int k = 0; k < substeps; k++) {
      double reached;
      if (jumped) must(CVodeReInit(solver, (tick + (double)k / substeps) * step, state), "restart");
      const double end = (tick + (k + 1.0) / substeps) * step;
      must(CVodeSetStopTime(solver, end), "stop time");
      must(CVode(solver, end, state, &reached, CV_NORMAL), "step");
      jumped = take_memory(y, step / substeps);
    }
    pending = jumped;
    oilspring_observe(y, u, m, observed);
    for (i = 0; i < wanted_count; i++) fwrite(&observed[wanted[i]], sizeof(double), 1, out);
  }
  fclose(out);
  return 0;
}
