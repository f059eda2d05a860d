// SPDX-License-Identifier: Apache-2.0
// Replaced by the first real source of this room.
namespace rillstrand {}
