"""A folder of lots: listed, mapped over workers, resumed, remembered and told."""
