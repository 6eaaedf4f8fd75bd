//! Methods: numbers, each with the plan that justifies it.
