// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/contour.h"

#include <algorithm>
#include <cstdint>
#include <unordered_map>

namespace deviascope {
namespace {

using Index = Eigen::Index;

/// Walks the squares of a padded field. An edge of a square is named by its lower node and its
/// direction; each edge that the line crosses is met by exactly two squares.
class Marcher {
  public:
    Marcher(const Eigen::ArrayXXd& field, double level)
        : field_(field), level_(level), rows_(field.rows() + 2), columns_(field.cols() + 2) {}

    std::vector<Polyline> lines() {
        for (Index row = 0; row + 1 < rows_; ++row)
            for (Index column = 0; column + 1 < columns_; ++column) visit(row, column);
        return joined();
    }

  private:
    /// Below the level outside the field.
    double value(Index row, Index column) const {
        const bool inside = row > 0 && column > 0 && row + 1 < rows_ && column + 1 < columns_;
        return inside ? field_(row - 1, column - 1) : -std::abs(level_) - 1.0;
    }
    bool above(Index row, Index column) const { return value(row, column) > level_; }
    bool is_outside(Index row, Index column) const {
        return row == 0 || column == 0 || row + 1 == rows_ || column + 1 == columns_;
    }

    std::int64_t edge(Index row, Index column, bool upright) const {
        return (row * columns_ + column) * 2 + (upright ? 1 : 0);
    }

    Point point_on(std::int64_t edge) const {
        const Index node = edge / 2, row = node / columns_, column = node % columns_;
        const Index row2 = row + edge % 2, column2 = column + (1 - edge % 2);
        // Lines that leave the field run along its last nodes.
        double share = 0.0;
        if (is_outside(row, column))
            share = 1.0;
        else if (!is_outside(row2, column2))
            share = (level_ - value(row, column)) / (value(row2, column2) - value(row, column));
        return {double(column - 1) + share * double(column2 - column),
                double(row - 1) + share * double(row2 - row)};
    }

    void link(std::int64_t from, std::int64_t to) { next_[from] = to; }

    /// Links the edges of a square so that what is above the level lies on the right.
    void visit(Index row, Index column) {
        const bool a = above(row, column), b = above(row, column + 1);
        const bool c = above(row + 1, column + 1), d = above(row + 1, column);
        const std::int64_t top = edge(row, column, false),
                           bottom = edge(row + 1, column, false);
        const std::int64_t left = edge(row, column, true), right = edge(row, column + 1, true);
        const int kind = (a ? 1 : 0) | (b ? 2 : 0) | (c ? 4 : 0) | (d ? 8 : 0);
        const auto middle_above = [&] {
            return value(row, column) + value(row, column + 1) + value(row + 1, column + 1) +
                       value(row + 1, column) >
                   4.0 * level_;
        };
        switch (kind) {
            case 1:
                return link(left, top);
            case 2:
                return link(top, right);
            case 3:
                return link(left, right);
            case 4:
                return link(right, bottom);
            case 6:
                return link(top, bottom);
            case 7:
                return link(left, bottom);
            case 8:
                return link(bottom, left);
            case 9:
                return link(bottom, top);
            case 11:
                return link(bottom, right);
            case 12:
                return link(right, left);
            case 13:
                return link(right, top);
            case 14:
                return link(top, left);
            case 5:
                if (middle_above()) {
                    link(left, bottom);
                    return link(right, top);
                }
                link(left, top);
                return link(right, bottom);
            case 10:
                if (middle_above()) {
                    link(top, left);
                    return link(bottom, right);
                }
                link(top, right);
                return link(bottom, left);
            default:
                return;
        }
    }

    std::vector<Polyline> joined() {
        std::vector<std::int64_t> starts;
        for (const auto& [from, to] : next_) starts.push_back(from);
        std::sort(starts.begin(), starts.end());
        std::vector<Polyline> lines;
        for (const std::int64_t start : starts) {
            if (!next_.contains(start)) continue;
            Polyline line{{}, true};
            for (auto at = next_.find(start); at != next_.end();) {
                line.point.push_back(point_on(at->first));
                const std::int64_t to = at->second;
                next_.erase(at);
                at = next_.find(to);
            }
            if (line.point.size() > 2) lines.push_back(std::move(line));
        }
        return lines;
    }

    const Eigen::ArrayXXd& field_;
    double level_;
    Index rows_, columns_;
    std::unordered_map<std::int64_t, std::int64_t> next_;
};

}  // namespace

std::vector<Polyline> level_lines(const Eigen::ArrayXXd& field, double level) {
    return Marcher(field, level).lines();
}

}  // namespace deviascope
