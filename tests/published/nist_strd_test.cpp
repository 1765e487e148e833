// All fourteen nonlinear problems through fit_least_squares, from the nearer of the two published starts.
//
// Source of data, models, starts and certified values: NIST/ITL Statistical Reference Datasets, nonlinear regression
// (public domain), READ in the public copy of repository ceres-solver/ceres-solver, commit
// fe351d5ab8cbc574f33456376bf5aa90d3162d5d, folder data/nist. For Rat43 the published header prints 9 degrees of
// freedom; 15 observations less 4 parameters are 11, and only 11 reproduces the certified standard deviations.
#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <fstream>
#include <numbers>
#include <string>
#include <vector>

#include "fitting/least_squares.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

constexpr double kTurn = 2 * std::numbers::pi;

struct Points {
  std::vector<double> x, y;
};

Points read_points(const std::string& name) {
  std::ifstream file(test::project_file("tests/published/data/nist_strd/" + name + ".csv"));
  Points points;
  std::string line;
  std::getline(file, line);
  EXPECT_EQ(line, "y,x");
  while (std::getline(file, line)) {
    const std::size_t comma = line.find(',');
    if (comma == std::string::npos) continue;
    points.y.push_back(std::stod(line.substr(0, comma)));
    points.x.push_back(std::stod(line.substr(comma + 1)));
  }
  return points;
}

template <class Problem>
struct Residuals {
  const Points& points;
  template <class T>
  bool operator()(const T* b, T* residuals) const {
    for (std::size_t i = 0; i < points.x.size(); ++i) {
      residuals[i] = points.y[i] - Problem::value(b, points.x[i]);
    }
    return true;
  }
};

template <class Problem, int N>
void expect_certified(const std::string& name, std::array<double, static_cast<std::size_t>(N)> start, std::array<double, static_cast<std::size_t>(N)> certified,
                      std::array<double, static_cast<std::size_t>(N)> certified_sd, double residual_sd) {
  const Points points = read_points(name);
  ASSERT_GT(points.x.size(), static_cast<std::size_t>(N));
  const Residuals<Problem> residuals{points};
  const auto fit = fit_least_squares<N>(residuals, static_cast<int>(points.x.size()), start);
  ASSERT_TRUE(fit) << fit.error().finding;
  EXPECT_TRUE(fit->usable()) << coilassay::name(fit->stop);
  for (int i = 0; i < N; ++i) {
    const double value = certified[static_cast<std::size_t>(i)], sd = certified_sd[static_cast<std::size_t>(i)];
    EXPECT_NEAR(fit->parameters[i] / value, 1, 1e-6) << name << " b" << i + 1;
    EXPECT_NEAR(fit->standard_uncertainty(i) / sd, 1, 1e-6) << name << " sd of b" << i + 1;
  }
  EXPECT_NEAR(std::sqrt(fit->reduced_chi_square) / residual_sd, 1, 1e-6) << name;
}

struct Misra1a {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * (1.0 - exp(-b[1] * x));
  }
};
TEST(NistStrd, Misra1a) {
  expect_certified<Misra1a, 2>("Misra1a", {250.0, 0.0005},
      {2.3894212918E+02, 5.5015643181E-04},
      {2.7070075241E+00, 7.2668688436E-06}, 1.0187876330E-01);
}

struct DanWood {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * pow(T(x), b[1]);
  }
};
TEST(NistStrd, DanWood) {
  expect_certified<DanWood, 2>("DanWood", {0.7, 4.0},
      {7.6886226176E-01, 3.8604055871E+00},
      {1.8281973860E-02, 5.1726610913E-02}, 3.2853114039E-02);
}

struct Chwirut2 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return exp(-b[0] * x) / (b[1] + b[2] * x);
  }
};
TEST(NistStrd, Chwirut2) {
  expect_certified<Chwirut2, 3>("Chwirut2", {0.15, 0.008, 0.01},
      {1.6657666537E-01, 5.1653291286E-03, 1.2150007096E-02},
      {3.8303286810E-02, 6.6621605126E-04, 1.5304234767E-03}, 3.1717133040E+00);
}

struct Lanczos3 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * exp(-b[1] * x) + b[2] * exp(-b[3] * x) + b[4] * exp(-b[5] * x);
  }
};
TEST(NistStrd, Lanczos3) {
  expect_certified<Lanczos3, 6>("Lanczos3", {0.5, 0.7, 3.6, 4.2, 4.0, 6.3},
      {8.6816414977E-02, 9.5498101505E-01, 8.4400777463E-01, 2.9515951832E+00, 1.5825685901E+00, 4.9863565084E+00},
      {1.7197908859E-02, 9.7041624475E-02, 4.1488663282E-02, 1.0766312506E-01, 5.8371576281E-02, 3.4436403035E-02}, 2.9923229172E-05);
}

struct MGH17 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] + b[1] * exp(-b[3] * x) + b[2] * exp(-b[4] * x);
  }
};
TEST(NistStrd, MGH17) {
  expect_certified<MGH17, 5>("MGH17", {0.5, 1.5, -1.0, 0.01, 0.02},
      {3.7541005211E-01, 1.9358469127E+00, -1.4646871366E+00, 1.2867534640E-02, 2.2122699662E-02},
      {2.0723153551E-03, 2.2031669222E-01, 2.2175707739E-01, 4.4861358114E-04, 8.9471996575E-04}, 1.3970497866E-03);
}

struct ENSO {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] + b[1] * std::cos(kTurn * x / 12) + b[2] * std::sin(kTurn * x / 12) + b[4] * cos(kTurn * x / b[3]) +
         b[5] * sin(kTurn * x / b[3]) + b[7] * cos(kTurn * x / b[6]) + b[8] * sin(kTurn * x / b[6]);
  }
};
TEST(NistStrd, ENSO) {
  expect_certified<ENSO, 9>("ENSO", {10.0, 3.0, 0.5, 44.0, -1.5, 0.5, 26.0, -0.1, 1.5},
      {1.0510749193E+01, 3.0762128085E+00, 5.3280138227E-01, 4.4311088700E+01, -1.6231428586E+00, 5.2554493756E-01, 2.6887614440E+01, 2.1232288488E-01, 1.4966870418E+00},
      {1.7488832467E-01, 2.4310052139E-01, 2.4354686618E-01, 9.4408025976E-01, 2.8078369611E-01, 4.8073701119E-01, 4.1612939130E-01, 5.1460022911E-01, 2.5434468893E-01}, 2.2269642403E+00);
}

struct Hahn1 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return (b[0] + x * (b[1] + x * (b[2] + x * b[3]))) / (1.0 + x * (b[4] + x * (b[5] + x * b[6])));
  }
};
TEST(NistStrd, Hahn1) {
  expect_certified<Hahn1, 7>("Hahn1", {1.0, -0.1, 0.005, -1e-06, -0.005, 0.0001, -1e-07},
      {1.0776351733E+00, -1.2269296921E-01, 4.0863750610E-03, -1.4262662514E-06, -5.7609940901E-03, 2.4053735503E-04, -1.2314450199E-07},
      {1.7070154742E-01, 1.2000289189E-02, 2.2508314937E-04, 2.7578037666E-07, 2.4712888219E-04, 1.0449373768E-05, 1.3027335327E-08}, 8.1803852243E-02);
}

struct MGH09 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * (x * x + x * b[1]) / (x * x + x * b[2] + b[3]);
  }
};
TEST(NistStrd, MGH09) {
  expect_certified<MGH09, 4>("MGH09", {0.25, 0.39, 0.415, 0.39},
      {1.9280693458E-01, 1.9128232873E-01, 1.2305650693E-01, 1.3606233068E-01},
      {1.1435312227E-02, 1.9633220911E-01, 8.0842031232E-02, 9.0025542308E-02}, 6.6279236551E-03);
}

struct MGH10 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * exp(b[1] / (x + b[2]));
  }
};
TEST(NistStrd, MGH10) {
  expect_certified<MGH10, 3>("MGH10", {0.02, 4000.0, 250.0},
      {5.6096364710E-03, 6.1813463463E+03, 3.4522363462E+02},
      {1.5687892471E-04, 2.3309021107E+01, 7.8486103508E-01}, 2.6009740065E+00);
}

struct Thurber {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return (b[0] + x * (b[1] + x * (b[2] + x * b[3]))) / (1.0 + x * (b[4] + x * (b[5] + x * b[6])));
  }
};
TEST(NistStrd, Thurber) {
  expect_certified<Thurber, 7>("Thurber", {1300.0, 1500.0, 500.0, 75.0, 1.0, 0.4, 0.05},
      {1.2881396800E+03, 1.4910792535E+03, 5.8323836877E+02, 7.5416644291E+01, 9.6629502864E-01, 3.9797285797E-01, 4.9727297349E-02},
      {4.6647963344E+00, 3.9571156086E+01, 2.8698696102E+01, 5.5675370270E+00, 3.1333340687E-02, 1.4984928198E-02, 6.5842344623E-03}, 1.3714600784E+01);
}

struct BoxBOD {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * (1.0 - exp(-b[1] * x));
  }
};
TEST(NistStrd, BoxBOD) {
  expect_certified<BoxBOD, 2>("BoxBOD", {100.0, 0.75},
      {2.1380940889E+02, 5.4723748542E-01},
      {1.2354515176E+01, 1.0455993237E-01}, 1.7088072423E+01);
}

struct Rat43 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] / pow(1.0 + exp(b[1] - b[2] * x), 1.0 / b[3]);
  }
};
TEST(NistStrd, Rat43) {
  expect_certified<Rat43, 4>("Rat43", {700.0, 5.0, 0.75, 1.3},
      {6.9964151270E+02, 5.2771253025E+00, 7.5962938329E-01, 1.2792483859E+00},
      {1.6302297817E+01, 2.0828735829E+00, 1.9566123451E-01, 6.8761936385E-01}, 2.8262414662E+01);
}

struct Eckerle4 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] / b[1] * exp(-0.5 * (x - b[2]) / b[1] * (x - b[2]) / b[1]);
  }
};
TEST(NistStrd, Eckerle4) {
  expect_certified<Eckerle4, 3>("Eckerle4", {1.5, 5.0, 450.0},
      {1.5543827178E+00, 4.0888321754E+00, 4.5154121844E+02},
      {1.5408051163E-02, 4.6803020753E-02, 4.6800518816E-02}, 6.7629245447E-03);
}

struct Bennett5 {
  template <class T>
  static T value(const T* b, double x) {
    using std::cos, std::exp, std::pow, std::sin;
    return b[0] * pow(b[1] + x, -1.0 / b[2]);
  }
};
TEST(NistStrd, Bennett5) {
  expect_certified<Bennett5, 3>("Bennett5", {-1500.0, 45.0, 0.85},
      {-2.5235058043E+03, 4.6736564644E+01, 9.3218483193E-01},
      {2.9715175411E+02, 1.2448871856E+00, 2.0272299378E-02}, 1.8629312528E-03);
}

}  // namespace
}  // namespace coilassay
