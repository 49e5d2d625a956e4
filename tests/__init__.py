"""The test suite; a package so that its helpers have one unambiguous name."""
