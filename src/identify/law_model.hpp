#pragma once
// A damping law, with everything else a recording holds, as a model of the samples of one decay.

#include <Eigen/Core>
#include <vector>

#include "identify/damping_law.hpp"
#include "identify/decay_model.hpp"

namespace ringwright::identify {

/// Offset, drift, tones, further modes and nuisance poles beside the law: `others` without the mode meant,
/// and the coefficients of its linear columns.
struct LawState {
    DampingLaw law;
    DecayModel others;
    Eigen::VectorXd coefficients;
};

/// Unit of time 1/rate; unit of length such that the scaled samples are the displacement or its derivatives
/// themselves.
class LawModel {
  public:
    LawModel(const DecaySamples& samples, Measured measured, double rate, const LawTerms& terms);

    [[nodiscard]] Eigen::VectorXd pack(const LawState& state) const;
    [[nodiscard]] LawState unpack(const Eigen::VectorXd& parameters, const LawState& like) const;
    /// The law's parameters that are free, in the order in which they stand after the linear coefficients.
    [[nodiscard]] const std::vector<LawParameter>& free() const { return free_; }
    /// False where the parameters have left the range in which the law means something.
    [[nodiscard]] bool usable(const LawState& state) const;

    /// Model at every sample; not finite where the motion runs away.
    [[nodiscard]] Eigen::VectorXd value(const LawState& state) const;
    /// Derivatives by all parameters in the order of `pack`.
    [[nodiscard]] Eigen::MatrixXd columns(const LawState& state) const;
    /// Derivatives by these parameters of the law alone.
    [[nodiscard]] Eigen::MatrixXd law_columns(const DampingLaw& law,
                                              const std::vector<LawParameter>& by) const;
    /// The motion itself at these times in s.
    [[nodiscard]] LawMotion motion(const DampingLaw& law, Measured what,
                                   const std::vector<double>& time_s) const;
    [[nodiscard]] double rate() const { return rate_; }
    [[nodiscard]] Measured measured() const { return measured_; }

  private:
    [[nodiscard]] Eigen::MatrixXd block_means_of(const Eigen::MatrixXd& fine) const;

    const DecaySamples& samples_;
    Measured measured_;
    double rate_;
    std::vector<LawParameter> free_;
    Eigen::Index points_ = 1;    // a block
    std::vector<double> times_;  // in units of 1/rate
};

}  // namespace ringwright::identify
