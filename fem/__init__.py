"""Freezing of moulded frozen water-ice confections: from a case file to a time, a place and a heat."""
