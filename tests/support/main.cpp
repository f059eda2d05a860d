// SPDX-License-Identifier: Apache-2.0
#if defined(__GNUC__) && !defined(__clang__)
// The standard library's regular expressions, under sanitizers, set off a false warning of g++ 12.
#pragma GCC diagnostic ignored "-Wmaybe-uninitialized"
#endif
#define CATCH_CONFIG_MAIN
#include <catch2/catch.hpp>
