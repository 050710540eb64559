// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/frame.h"

#include <erfa.h>
#include <erfam.h>

#include <algorithm>

namespace deviascope {

namespace {

/// Takes off the rounding left by angles: one Newton step towards the nearest rotation.
Eigen::Matrix3d orthonormal(const Eigen::Matrix3d& nearly) {
    return 0.5 * nearly * (3.0 * Eigen::Matrix3d::Identity() - nearly.transpose() * nearly);
}

/// The matrix inside eraIcrs2g: the routine gives angles only, so the ICRS axes go through it.
Eigen::Matrix3d icrs_to_galactic() {
    Eigen::Matrix3d matrix;
    for (int axis = 0; axis < 3; ++axis) {
        Eigen::Vector3d from = Eigen::Vector3d::Unit(axis);
        double ra = 0.0, dec = 0.0, l = 0.0, b = 0.0;
        eraC2s(from.data(), &ra, &dec);
        eraIcrs2g(ra, dec, &l, &b);
        Eigen::Vector3d to;
        eraS2c(l, b, to.data());
        matrix.col(axis) = to;
    }
    return orthonormal(matrix);
}

Eigen::Matrix3d icrs_to_ecliptic() {
    double rows[3][3];
    eraEcm06(ERFA_DJ00, 0.0, rows);
    return Eigen::Map<const Eigen::Matrix<double, 3, 3, Eigen::RowMajor>>(&rows[0][0]);
}

const Eigen::Matrix3d& from_icrs(Frame frame) {
    static const Eigen::Matrix3d galactic = icrs_to_galactic();
    static const Eigen::Matrix3d icrs = Eigen::Matrix3d::Identity();
    static const Eigen::Matrix3d ecliptic = icrs_to_ecliptic();
    switch (frame) {
        case Frame::galactic:
            return galactic;
        case Frame::ecliptic:
            return ecliptic;
        case Frame::icrs:
            break;
    }
    return icrs;
}

}  // namespace

const std::vector<std::string>& frame_names() {
    static const std::vector<std::string> names{"galactic", "icrs", "ecliptic"};
    return names;
}

std::string name_of(Frame frame) {
    return frame_names().at(static_cast<std::size_t>(frame));
}

std::optional<Frame> frame_of_name(std::string_view name) {
    const auto& names = frame_names();
    const auto found = std::find(names.begin(), names.end(), name);
    if (found == names.end()) return {};
    return static_cast<Frame>(found - names.begin());
}

Eigen::Matrix3d rotation(Frame from, Frame to) {
    if (from == to) return Eigen::Matrix3d::Identity();
    return from_icrs(to) * from_icrs(from).transpose();
}

}  // namespace deviascope
