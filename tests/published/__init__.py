"""Published results as data, and the tests that hold the package against them."""
