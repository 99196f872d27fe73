//! Tests of the whole room: texts in, trees and diagnostics out.
