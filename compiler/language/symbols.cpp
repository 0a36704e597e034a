// Scopes as a stack of bindings for every name; see symbols.h.
#include "language/symbols.h"

#include <algorithm>

namespace isinglass {

void Scopes::close() {
  for (auto* bindings : levels_.back().bound) bindings->pop_back();
  levels_.pop_back();
}

Symbol& Scopes::add(Symbol symbol) {
  levels_.back().owned.push_back(std::make_unique<Symbol>(std::move(symbol)));
  Symbol& added = *levels_.back().owned.back();
  bind(added.name, added);
  return added;
}

void Scopes::bind(const std::string& name, Symbol& symbol) {
  auto& bindings = names_[name];
  bindings.push_back({&symbol, depth()});
  levels_.back().bound.push_back(&bindings);
}

Symbol& Scopes::add_everywhere(Symbol& symbol) {
  auto& bindings = names_[symbol.name];
  bindings.insert(bindings.begin(), {&symbol, 0});
  return symbol;
}

std::vector<Symbol*> Scopes::globals() const {
  std::vector<Symbol*> symbols;
  if (levels_.size() < 2) return symbols;
  for (const auto& symbol : levels_[1].owned) symbols.push_back(symbol.get());
  return symbols;
}

bool Scopes::sees(const Binding& binding) const {
  if (binding.depth >= frame || binding.depth == 0) return true;
  if (binding.depth > 1) return false;
  const Symbol::Kind kind = binding.symbol->kind;
  return kind == Symbol::Kind::constant || kind == Symbol::Kind::broken || binding.symbol->is_callable();
}

Symbol* Scopes::find(std::string_view name) const {
  const auto place = names_.find(name);
  if (place == names_.end()) return nullptr;
  const auto& bindings = place->second;
  for (auto binding = bindings.rbegin(); binding != bindings.rend(); ++binding) {
    if (sees(*binding)) return binding->symbol;
  }
  return nullptr;
}

Symbol* Scopes::find_anywhere(std::string_view name) const {
  const auto place = names_.find(name);
  return place == names_.end() || place->second.empty() ? nullptr : place->second.back().symbol;
}

Symbol* Scopes::find_innermost(std::string_view name) const {
  const auto place = names_.find(name);
  if (place == names_.end() || place->second.empty() || place->second.back().depth != depth()) return nullptr;
  return place->second.back().symbol;
}

namespace {

/// Whether one insertion, deletion, change or swap of neighbours turns one word into the other.
bool one_slip(std::string_view a, std::string_view b) {
  if (a.size() > b.size()) std::swap(a, b);
  if (b.size() - a.size() > 1 || a == b) return false;
  std::size_t i = 0;
  while (i < a.size() && a[i] == b[i]) ++i;
  if (a.size() < b.size()) return a.substr(i) == b.substr(i + 1);
  if (a.substr(i + 1) == b.substr(i + 1)) return true;
  return i + 1 < a.size() && a[i] == b[i + 1] && a[i + 1] == b[i] && a.substr(i + 2) == b.substr(i + 2);
}

}  // namespace

std::string Scopes::similar(std::string_view name, bool callable) const {
  std::string best;
  for (const auto& [other, bindings] : names_) {
    if (bindings.empty() || !one_slip(name, other)) continue;
    if (other.size() < 2 && name.size() < 2) continue;
    if (bindings.back().symbol->is_callable() != callable || !sees(bindings.back())) continue;
    // Rather one that begins alike.
    const bool better = (other[0] == name[0]) != (best.empty() ? false : best[0] == name[0])
                            ? other[0] == name[0]
                            : other < best;
    if (best.empty() || better) best = other;
  }
  return best;
}

}  // namespace isinglass
