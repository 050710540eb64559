// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): how a boost moves the properties of sources
#pragma once

#include <string>

namespace deviascope {

/// Properties by what a boost does to them.
enum class Displaced { not_at_all, flux, magnitude, redshift, size };

/// By the property's name in a job file: others than these four are not moved at all.
Displaced displaced_by_boost(const std::string& property);

/// The coordinate y of a property in which a boost by the Doppler factor delta is exactly a
/// displacement, y' = y + v ln delta:
///
///   flux       y = ln S      v = 1 + alpha       from S' = S delta^(1+alpha)
///   magnitude  y = m         v = -k (1 + alpha)  from m' = m - k (1+alpha) ln delta
///   redshift   y = ln(1+z)   v = -1              from 1+z' = (1+z) / delta
///   size       y = ln s      v = -1              from s' = s / delta
///
/// with k = 2.5 / ln 10.
///
/// @return  NaN where it is not defined (a flux or size not above 0, z not above -1)
/// Source: sky/boost.h.
double coordinate_of(Displaced kind, double value);

/// The value at a coordinate: the inverse of coordinate_of.
double value_at(Displaced kind, double y);

/// v, without the factor 1 + alpha of flux and magnitude.
double speed_of(Displaced kind);

/// Whether 1 + alpha is a factor of v.
bool feels_spectral_index(Displaced kind);

/// Half-width, in y, of the neighbourhood of an edge that is looked at: 1.4 in ln S, ln s and
/// in the magnitudes that go with it; 0.4 in ln(1+z), where distributions bend sooner.
double neighbourhood_of(Displaced kind);

/// Whether the property itself ends at this value: flux and size 0, redshift 0.
bool is_end_of_property(Displaced kind, double value);

/// `ln S`, `magnitudes`, `ln(1+z)`, `ln s`: what y is measured in.
const char* unit_of_coordinate(Displaced kind);

}  // namespace deviascope
