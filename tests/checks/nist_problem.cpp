#include "checks/nist_problem.hpp"

#include <cmath>
#include <fstream>
#include <map>
#include <numbers>
#include <sstream>
#include <stdexcept>

namespace nist {
namespace {

using Parameters = std::vector<Complex>;
using Predictors = std::vector<double>;
constexpr double pi = std::numbers::pi;

double last_number(const std::string& line) {
    return std::stod(line.substr(line.find_last_of(" \t", line.find_last_not_of(" \t\r")) + 1));
}

bool reads_parameter(const std::string& line, CertifiedParameter& parameter) {
    const std::size_t equals = line.find('=');
    const std::size_t letter = line.find_first_not_of(' ');
    if (equals == std::string::npos || line[letter] != 'b') return false;
    if (line.substr(letter + 1, equals - letter - 1).find_first_not_of("0123456789 ") != std::string::npos)
        return false;
    std::istringstream numbers(line.substr(equals + 1));
    return static_cast<bool>(numbers >> parameter.start_1 >> parameter.start_2 >> parameter.value >>
                             parameter.standard_deviation);
}

void read_observation(const std::string& line, Dataset& dataset) {
    std::istringstream numbers(line);
    double value = 0.0;
    if (!(numbers >> value)) return;
    dataset.response.push_back(value);
    dataset.predictors.emplace_back();
    while (numbers >> value) dataset.predictors.back().push_back(value);
}

Complex power(Complex base, Complex exponent) {
    return std::exp(exponent * std::log(base));
}

Complex gauss(const Parameters& b, const Predictors& x) {
    const Complex first = (x[0] - b[3]) / b[4];
    const Complex second = (x[0] - b[6]) / b[7];
    return b[0] * std::exp(-b[1] * x[0]) + b[2] * std::exp(-first * first) +
           b[5] * std::exp(-second * second);
}

Complex lanczos(const Parameters& b, const Predictors& x) {
    return b[0] * std::exp(-b[1] * x[0]) + b[2] * std::exp(-b[3] * x[0]) + b[4] * std::exp(-b[5] * x[0]);
}

Complex chwirut(const Parameters& b, const Predictors& x) {
    return std::exp(-b[0] * x[0]) / (b[1] + b[2] * x[0]);
}

Complex cubic_over_cubic(const Parameters& b, const Predictors& x) {
    const double t = x[0];
    return (b[0] + t * (b[1] + t * (b[2] + t * b[3]))) / (1.0 + t * (b[4] + t * (b[5] + t * b[6])));
}

Complex kirby(const Parameters& b, const Predictors& x) {
    const double t = x[0];
    return (b[0] + t * (b[1] + t * b[2])) / (1.0 + t * (b[3] + t * b[4]));
}

Complex enso(const Parameters& b, const Predictors& x) {
    const double year = 2.0 * pi * x[0] / 12.0;
    const Complex slow = 2.0 * pi * x[0] / b[3];
    const Complex quick = 2.0 * pi * x[0] / b[6];
    return b[0] + b[1] * std::cos(year) + b[2] * std::sin(year) + b[4] * std::cos(slow) +
           b[5] * std::sin(slow) + b[7] * std::cos(quick) + b[8] * std::sin(quick);
}

Complex eckerle(const Parameters& b, const Predictors& x) {
    const Complex distance = (x[0] - b[2]) / b[1];
    return b[0] / b[1] * std::exp(-0.5 * distance * distance);
}

std::map<std::string, Model> all_models() {
    using P = const Parameters&;
    using X = const Predictors&;
    return {
        {"Bennett5", [](P b, X x) { return b[0] * power(b[1] + x[0], -1.0 / b[2]); }},
        {"BoxBOD", [](P b, X x) { return b[0] * (1.0 - std::exp(-b[1] * x[0])); }},
        {"Chwirut1", chwirut},
        {"Chwirut2", chwirut},
        {"DanWood", [](P b, X x) { return b[0] * power(x[0], b[1]); }},
        {"ENSO", enso},
        {"Eckerle4", eckerle},
        {"Gauss1", gauss},
        {"Gauss2", gauss},
        {"Gauss3", gauss},
        {"Hahn1", cubic_over_cubic},
        {"Kirby2", kirby},
        {"Lanczos1", lanczos},
        {"Lanczos2", lanczos},
        {"Lanczos3", lanczos},
        {"MGH09",
         [](P b, X x) { return b[0] * (x[0] * x[0] + x[0] * b[1]) / (x[0] * x[0] + x[0] * b[2] + b[3]); }},
        {"MGH10", [](P b, X x) { return b[0] * std::exp(b[1] / (x[0] + b[2])); }},
        {"MGH17",
         [](P b, X x) { return b[0] + b[1] * std::exp(-x[0] * b[3]) + b[2] * std::exp(-x[0] * b[4]); }},
        {"Misra1a", [](P b, X x) { return b[0] * (1.0 - std::exp(-b[1] * x[0])); }},
        {"Misra1b", [](P b, X x) { return b[0] * (1.0 - power(1.0 + b[1] * x[0] / 2.0, -2.0)); }},
        {"Misra1c", [](P b, X x) { return b[0] * (1.0 - power(1.0 + 2.0 * b[1] * x[0], -0.5)); }},
        {"Misra1d", [](P b, X x) { return b[0] * b[1] * x[0] / (1.0 + b[1] * x[0]); }},
        {"Nelson", [](P b, X x) { return b[0] - b[1] * x[0] * std::exp(-b[2] * x[1]); }},
        {"Rat42", [](P b, X x) { return b[0] / (1.0 + std::exp(b[1] - b[2] * x[0])); }},
        {"Rat43", [](P b, X x) { return b[0] / power(1.0 + std::exp(b[1] - b[2] * x[0]), 1.0 / b[3]); }},
        {"Roszman1", [](P b, X x) { return b[0] - b[1] * x[0] - std::atan(b[2] / (x[0] - b[3])) / pi; }},
        {"Thurber", cubic_over_cubic},
    };
}

}  // namespace

Dataset read_dataset(const std::string& name) {
    const std::string path = std::string(RINGWRIGHT_TEST_DATA) + "/checks/data/nist/" + name + ".dat";
    std::ifstream file(path);
    if (!file) throw std::runtime_error("cannot open " + path);
    Dataset dataset;
    dataset.name = name;
    CertifiedParameter parameter;
    int line_number = 0;
    for (std::string line; std::getline(file, line);) {
        ++line_number;
        if (line_number > 60) read_observation(line, dataset);  // data start on line 61 in every file
        if (line_number <= 40) continue;                        // certified values start on line 41
        if (line_number <= 60 && reads_parameter(line, parameter)) dataset.parameters.push_back(parameter);
        if (line.starts_with("Residual Sum of Squares")) dataset.residual_sum_of_squares = last_number(line);
        if (line.starts_with("Residual Standard Dev"))
            dataset.residual_standard_deviation = last_number(line);
    }
    if (dataset.parameters.empty() || dataset.response.size() <= dataset.parameters.size())
        throw std::runtime_error("no data or no parameters in " + path);
    if (name == "Nelson")  // its model is of log y
        for (double& value : dataset.response) value = std::log(value);
    return dataset;
}

Model model_of(const std::string& name) {
    static const std::map<std::string, Model> models = all_models();
    return models.at(name);
}

}  // namespace nist
