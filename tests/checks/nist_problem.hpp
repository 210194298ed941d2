#pragma once
// The NIST Statistical Reference Datasets for nonlinear regression: reader of their file layout, and the
// models.

#include <Eigen/Core>
#include <complex>
#include <functional>
#include <string>
#include <vector>

namespace nist {

/// One parameter as the file gives it.
struct CertifiedParameter {
    double start_1 = 0.0, start_2 = 0.0;
    double value = 0.0, standard_deviation = 0.0;
};

struct Dataset {
    std::string name;
    std::vector<CertifiedParameter> parameters;
    double residual_sum_of_squares = 0.0;
    double residual_standard_deviation = 0.0;
    std::vector<double> response;
    std::vector<std::vector<double>> predictors;  ///< one row an observation
};

/// Reads tests/checks/data/nist/NAME.dat; throws std::runtime_error when it is not there or not in the
/// layout.
Dataset read_dataset(const std::string& name);

using Complex = std::complex<double>;
using Model =
    std::function<Complex(const std::vector<Complex>& parameters, const std::vector<double>& predictors)>;

/// The model that the file of that name states.
Model model_of(const std::string& name);

}  // namespace nist
