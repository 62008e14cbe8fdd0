// Times CHOLMOD and Eigen on a symmetric matrix in Matrix Market form (lower
// triangle, as "bench -dump" writes it), with three right-hand sides
// b[3i+r] = (3i+r) mod 7 − 3. One line of JSON, times in seconds of the process,
// medians over reps.
//
//	g++ -O3 -march=native -DNDEBUG -I/usr/include/suitesparse -I/usr/include/eigen3
//	    reference.cpp -o reference -lcholmod -lopenblas
//	./reference FILE amd|metis super|simpl reps      (CHOLMOD)
//	./reference FILE eigen llt|ldlt reps             (Eigen, its AMD)
#include <Eigen/Sparse>
#include <algorithm>
#include <cholmod.h>
#include <cstdio>
#include <cstdlib>
#include <cstring>
#include <ctime>
#include <functional>
#include <sys/resource.h>
#include <vector>

static double cpu() { timespec t; clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t); return t.tv_sec + 1e-9 * t.tv_nsec; }
static double peak() { rusage u; getrusage(RUSAGE_SELF, &u); return u.ru_maxrss / 1024.0; }
static double median(std::vector<double> v) { std::sort(v.begin(), v.end()); return v[v.size() / 2]; }
static double timed(const std::function<void()> &f) { double t = cpu(); f(); return cpu() - t; }

using Sparse = Eigen::SparseMatrix<double>;
struct Times { std::vector<double> analyze, factor, refactor, solve; double checksum = 0; };

template <class Solver> static void eigen(const Sparse &a, const Eigen::MatrixXd &b, int reps, Times &t) {
  for (int r = 0; r < reps; r++) {
    Solver s;
    Eigen::MatrixXd x;
    t.analyze.push_back(timed([&] { s.analyzePattern(a); }));
    t.factor.push_back(timed([&] { s.factorize(a); }));
    t.refactor.push_back(timed([&] { s.factorize(a); }));
    x = s.solve(b);
    t.solve.push_back(timed([&] { x = s.solve(b); }));
    t.checksum = x.sum();
  }
}

static void cholmod(Sparse &a, Eigen::MatrixXd &b, const char *order, const char *mode, int reps, Times &t) {
  cholmod_common c;
  cholmod_start(&c);
  c.nmethods = 1;
  c.method[0].ordering = !strcmp(order, "metis") ? CHOLMOD_METIS : CHOLMOD_AMD;
  c.postorder = 1;
  c.supernodal = !strcmp(mode, "super") ? CHOLMOD_SUPERNODAL : CHOLMOD_SIMPLICIAL;
  cholmod_sparse m{};
  m.nrow = m.ncol = a.rows();
  m.nzmax = a.nonZeros();
  m.p = a.outerIndexPtr();
  m.i = a.innerIndexPtr();
  m.x = a.valuePtr();
  m.stype = -1;
  m.itype = CHOLMOD_INT;
  m.xtype = CHOLMOD_REAL;
  m.sorted = m.packed = 1;
  cholmod_dense rhs{};
  rhs.nrow = rhs.d = a.rows();
  rhs.ncol = 3;
  rhs.nzmax = 3 * a.rows();
  rhs.x = b.data();
  rhs.xtype = CHOLMOD_REAL;
  for (int r = 0; r < reps; r++) {
    cholmod_factor *l = nullptr;
    cholmod_dense *x = nullptr, *y = nullptr, *e = nullptr;
    t.analyze.push_back(timed([&] { l = cholmod_analyze(&m, &c); }));
    t.factor.push_back(timed([&] { cholmod_factorize(&m, l, &c); }));
    t.refactor.push_back(timed([&] { cholmod_factorize(&m, l, &c); }));
    auto solve = [&] { cholmod_solve2(CHOLMOD_A, l, &rhs, nullptr, &x, nullptr, &y, &e, &c); };
    solve();
    t.solve.push_back(timed(solve));
    t.checksum = 0;
    for (int k = 0; k < 3 * a.rows(); k++) t.checksum += ((double *)x->x)[k];
    cholmod_free_dense(&x, &c);
    cholmod_free_dense(&y, &c);
    cholmod_free_dense(&e, &c);
    cholmod_free_factor(&l, &c);
  }
  cholmod_finish(&c);
}

int main(int argc, char **argv) {
  if (argc != 5) { fprintf(stderr, "usage: %s FILE amd|metis|eigen super|simpl|llt|ldlt reps\n", argv[0]); return 2; }
  FILE *f = fopen(argv[1], "r");
  if (!f) { perror(argv[1]); return 1; }
  char line[256];
  do if (!fgets(line, sizeof line, f)) return 1; while (line[0] == '%');
  int n = 0, cols = 0, nnz = 0;
  if (sscanf(line, "%d %d %d", &n, &cols, &nnz) != 3) return 1;
  Sparse a(n, n);
  {
    std::vector<Eigen::Triplet<double>> entries;
    entries.reserve(nnz);
    int i, j;
    double v;
    while (fscanf(f, "%d %d %lf", &i, &j, &v) == 3) entries.emplace_back(i - 1, j - 1, v);
    a.setFromTriplets(entries.begin(), entries.end());
  }
  fclose(f);
  Eigen::MatrixXd b(n, 3);
  for (int i = 0; i < n; i++)
    for (int r = 0; r < 3; r++) b(i, r) = (3 * i + r) % 7 - 3;
  double base = peak();
  int reps = atoi(argv[4]);
  Times t;
  if (!strcmp(argv[2], "eigen")) {
    if (!strcmp(argv[3], "llt")) eigen<Eigen::SimplicialLLT<Sparse>>(a, b, reps, t);
    else eigen<Eigen::SimplicialLDLT<Sparse>>(a, b, reps, t);
  } else cholmod(a, b, argv[2], argv[3], reps, t);
  printf("{\"tool\":\"%s\",\"ordering\":\"%s\",\"mode\":\"%s\",\"N\":%d,\"nnzA\":%d,\"cpu_analyze\":%.6f,\"cpu_factor\":%.6f,"
         "\"cpu_refactor\":%.6f,\"cpu_solve3\":%.6f,\"base_mb\":%.1f,\"peak_mb\":%.1f,\"checksum\":%.12g}\n",
         !strcmp(argv[2], "eigen") ? "eigen" : "cholmod", argv[2], argv[3], n, (int)a.nonZeros(), median(t.analyze),
         median(t.factor), median(t.refactor), median(t.solve), base, peak(), t.checksum);
}
