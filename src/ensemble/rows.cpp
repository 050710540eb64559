// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/rows.h"

#include <algorithm>
#include <vector>

#include "deviascope/core/random.h"

namespace deviascope {

namespace {

std::size_t points_per_row(const Draws& draws) {
    return static_cast<std::size_t>(draws.n_replicates * draws.n_walkers);
}

}  // namespace

Draws empty_draws(const Target& target, const EnsembleShape& shape) {
    Draws draws;
    draws.n_replicates = shape.n_replicates;
    draws.n_walkers = shape.n_walkers;
    draws.n_parameters = static_cast<Eigen::Index>(target.parameters().size());
    return draws;
}

void resize_rows(Draws& draws, Eigen::Index n_rows) {
    const std::size_t n_points = static_cast<std::size_t>(n_rows) * points_per_row(draws);
    draws.n_rows = n_rows;
    draws.value.resize(n_points * static_cast<std::size_t>(draws.n_parameters));
    draws.log_posterior.resize(n_points);
    draws.log_likelihood.resize(n_points);
}

void reserve_rows(Draws& draws, Eigen::Index n_rows) {
    const std::size_t n_points = static_cast<std::size_t>(n_rows) * points_per_row(draws);
    draws.value.reserve(n_points * static_cast<std::size_t>(draws.n_parameters));
    draws.log_posterior.reserve(n_points);
    draws.log_likelihood.reserve(n_points);
}

std::size_t row_bytes(const Draws& draws) {
    return points_per_row(draws) * static_cast<std::size_t>(draws.n_parameters + 2) *
           sizeof(double);
}

void RowWriter::write(const EnsembleState& state,
                      const Place& place,
                      Redrawn redrawn,
                      Draws& draws) const {
    const std::size_t from = walker_index(shape_, place.replicate, 0);
    const std::size_t to = static_cast<std::size_t>(place.row) * points_per_row(draws) + from;
    const auto n = static_cast<std::size_t>(shape_.n_walkers);
    std::copy_n(state.log_posterior.data() + from, n, draws.log_posterior.data() + to);
    std::copy_n(state.log_likelihood.data() + from, n, draws.log_likelihood.data() + to);
    const Eigen::Map<const Eigen::MatrixXd> coordinates(
        state.coordinates.data() + from * static_cast<std::size_t>(shape_.n_coordinates),
        shape_.n_coordinates,
        shape_.n_walkers);
    Eigen::Map<Eigen::MatrixXd> parameters(
        draws.value.data() + to * static_cast<std::size_t>(draws.n_parameters),
        draws.n_parameters,
        shape_.n_walkers);
    target_.to_parameters(coordinates, parameters);
    if (redrawn == Redrawn::drawn) redraw(place, parameters);
}

void RowWriter::redraw(const Place& place, Eigen::Ref<Eigen::MatrixXd> parameters) const {
    std::vector<Stream> streams;
    streams.reserve(static_cast<std::size_t>(shape_.n_walkers));
    for (Eigen::Index walker = 0; walker < shape_.n_walkers; ++walker)
        streams.emplace_back(seed_,
                             Purpose::monopole_redraw,
                             static_cast<std::uint64_t>(place.replicate),
                             static_cast<std::uint64_t>(walker),
                             static_cast<std::uint64_t>(place.step));
    target_.redraw(streams, parameters);
}

}  // namespace deviascope
