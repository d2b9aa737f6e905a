"""What went wrong in a hand result: one kind of slip a file."""

from symbolic_response.hand.diagnosis.diagnose import diagnose as diagnose
from symbolic_response.hand.diagnosis.finding import Finding as Finding
