"""Parameter sets, one function per published or demo set, apart from the formulas they feed."""
